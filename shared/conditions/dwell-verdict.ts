import type { ProtocolDocument } from '../protocol/document';
import { sideAt } from '../protocol/stations';
import { pendulumOf, predictEquilibriumRad } from '../protocol/predict';
import type { RigDocument } from '../rig/document';
import { channelReadings } from './channel-condition';
import { fitFreeSwing, LEAVES_FIT_RAD, type FreeSwing } from './free-swing';
import { longestSilenceS, type Series } from './series';

/** Whether a dwell is good by what was fixed beforehand and by the rules of the archive format; never by its own value. */

export interface DwellFacts {
  seq: number;
  side: 'near' | 'far' | null;
  /** Middle of the dwell, UTC ms. */
  midUtcMs: number;
  /** Fitted centre there, rad; null where the samples do not tell. */
  centreRad: number | null;
  /** Of one sample about the fit, rad. */
  residualRad: number | null;
  period: { value: number; u: number } | null;
  good: boolean;
  /** One sentence for each thing that makes it not good. */
  why: string[];
  /** Its deflection was silent for so long that it is not good. */
  silent: boolean;
  /** In a sentence, that the pendulum did not answer the swing before it; null where it did, or where that cannot be told. */
  noResponse: string | null;
  /** In a sentence, that it swings out too far for another swing of the sources; null where it does not, or where that cannot be told. */
  excursion: string | null;
  /** Noise about the fit that is too much for an ordinary night, and since when, UTC ms; null where it is not. */
  loud: { words: string; sinceUtcMs: number } | null;
}

export interface DwellLook {
  rig: RigDocument;
  goodWhen: ProtocolDocument['goodWhen'];
  seq: number;
  fromUtcMs: number;
  /** Planned end. */
  toUtcMs: number;
  angleDeg: number;
  /** Where the plain swing that it directly follows began; null where there was none, or one that was broken. */
  swungFromDeg: number | null;
  /** The dwell before that swing, as far as it was judged. */
  before: Pick<DwellFacts, 'centreRad'> | null;
  /** When it is looked at: what has not come by then cannot be judged. */
  nowUtcMs: number;
  /** Null where the rig has no live deflection: then the data come later, and nothing is said against the dwell. */
  deflection: Series | null;
  /** Null for a channel that nothing ever came into. */
  channel(name: string): Series | null;
  /** A rehearsal: a channel that is not simulated counts as met. */
  simulated: boolean;
}

/** A dwell is not good when its deflection is silent for longer, or leaves the fit for longer, s (archive format). */
const MOST_SILENT_S = 60;
const MOST_OFF_S = 30;
/** What leaves the fit again within this is the same disturbance, s: a shaking thing passes its middle in between. */
const SAME_DISTURBANCE_S = 10;
/** Samples come in batches: silence at the end counts from here on, and is then taken to last until the end, s. */
const BATCH_S = 12;

export function judgeDwell(look: DwellLook): DwellFacts {
  const { rig, seq, fromUtcMs, toUtcMs, angleDeg } = look;
  const swing = fitFreeSwing(rig, look.deflection, { fromUtcMs, toUtcMs, angleDeg });
  const silent = silence(look);
  const why = [...silent, ...disturbance(swing), ...residual(look, swing), ...surroundings(look)];
  return {
    seq,
    side: sideAt(rig, angleDeg),
    midUtcMs: (fromUtcMs + toUtcMs) / 2,
    centreRad: swing?.centreRad ?? null,
    residualRad: swing?.residualRad ?? null,
    period: swing?.period ?? null,
    good: why.length === 0,
    why,
    silent: silent.length > 0,
    noResponse: noResponse(look, swing),
    excursion: excursion(look, swing),
    loud: loud(look, swing),
  };
}

function silence({ deflection, fromUtcMs, toUtcMs, nowUtcMs }: DwellLook): string[] {
  if (deflection === null) return [];
  const last = deflection.utcMs.at(-1) ?? fromUtcMs;
  const seenUtcMs = nowUtcMs - last > 1000 * BATCH_S ? toUtcMs : Math.min(last, toUtcMs);
  const silentS = longestSilenceS(deflection, { fromUtcMs, toUtcMs: seenUtcMs });
  return silentS > MOST_SILENT_S ? [`deflection silent for ${Math.round(silentS)} s, more than ${MOST_SILENT_S} s`] : [];
}

function disturbance(swing: FreeSwing | null): string[] {
  if (swing === null) return [];
  const { lengthS, greatestRad } = longestDisturbance(swing.boxes);
  return lengthS > MOST_OFF_S
    ? [
        `deflection off its fit by up to ${micro(greatestRad)} µrad for ${Math.round(lengthS)} s, more than ${micro(LEAVES_FIT_RAD)} µrad for ${MOST_OFF_S} s`,
      ]
    : [];
}

const micro = (rad: number) => String(Math.round(1e6 * rad));

function longestDisturbance({ utcMs, offRad }: FreeSwing['boxes']): { lengthS: number; greatestRad: number } {
  let longest = { lengthS: 0, greatestRad: 0 };
  let present = { fromUtcMs: -Infinity, toUtcMs: -Infinity, greatestRad: 0 };
  for (const [index, off] of offRad.entries()) {
    const size = Math.abs(off);
    if (size <= LEAVES_FIT_RAD) continue;
    const at = utcMs[index] as number;
    const same = at - present.toUtcMs <= 1000 * SAME_DISTURBANCE_S;
    const fromUtcMs = same ? present.fromUtcMs : at;
    present = { fromUtcMs, toUtcMs: at, greatestRad: same ? Math.max(present.greatestRad, size) : size };
    const lengthS = (at - fromUtcMs) / 1000;
    if (lengthS > longest.lengthS) longest = { lengthS, greatestRad: present.greatestRad };
  }
  return longest;
}

function residual({ goodWhen }: DwellLook, swing: FreeSwing | null): string[] {
  const limit = goodWhen?.residual_urad;
  if (limit === undefined || swing === null) return [];
  const found = 1e6 * swing.residualRad;
  return found <= limit ? [] : [`residual ${found.toPrecision(2)} µrad, more than ${limit} µrad`];
}

/** As in the proof of the first pair: noise about the fit beyond so many times that of the rig document is worth a look. */
const USUAL_RATIO = 3;

/** Against the protocol's own limit, or else against the noise that the rig document tells. */
function loud({ goodWhen, rig, fromUtcMs }: DwellLook, swing: FreeSwing | null): DwellFacts['loud'] {
  const noise = rig.noise?.readout_rad ?? 0;
  const limitRad = goodWhen?.residual_urad === undefined ? USUAL_RATIO * noise : 1e-6 * goodWhen.residual_urad;
  if (swing === null || limitRad === 0 || swing.residualRad <= limitRad) return null;
  const words = `Noise about the fit of ${(1e6 * swing.residualRad).toPrecision(2)} µrad, more than ${(1e6 * limitRad).toPrecision(2)} µrad.`;
  return { words, sinceUtcMs: fromUtcMs };
}

/** A plain swing leaves the pendulum swinging by about the change of its rest position; a tenth of that is no answer (an estimate). */
const LEAST_ANSWER = 0.1;
/** Ringing of before may cancel that of the swing; then the middle has moved all the same, by the plan within this. */
const AS_PLANNED = 0.2;
/** Below so many standard uncertainties of the fitted amplitude nothing is said. */
const SURE = 5;

/** A pendulum that touches or is caged: no swing at its own period, and no new place to swing about. */
function noResponse(
  { rig, swungFromDeg, angleDeg, fromUtcMs, toUtcMs, deflection, before }: DwellLook,
  swing: FreeSwing | null,
): string | null {
  if (swing === null || swungFromDeg === null || deflection === null || rig.sources.shape === 'none') return null;
  const [fromRad, toRad] = [swungFromDeg, angleDeg].map((deg) => predictEquilibriumRad(rig, deg));
  const gamma = pendulumOf(rig)?.oscillator.gamma;
  if (fromRad == null || toRad == null || gamma === undefined) return null;
  const plannedRad = Math.abs(toRad - fromRad);
  const growth = Math.exp((gamma * (toUtcMs - fromUtcMs)) / 1000);
  const uRad = growth * swing.residualRad * Math.sqrt(2 / deflection.value.length);
  if (SURE * uRad > LEAST_ANSWER * plannedRad) return null;
  const foundRad = growth * swing.amplitudeRad;
  if (foundRad >= LEAST_ANSWER * plannedRad) return null;
  const movedRad = before?.centreRad == null ? null : swing.centreRad - before.centreRad;
  if (movedRad !== null && Math.abs(movedRad - (toRad - fromRad)) <= AS_PLANNED * plannedRad) return null;
  return `the pendulum did not answer the swing: it swings by ${micro(foundRad)} µrad, about ${micro(plannedRad)} µrad were to be expected`;
}

/** From here on the pendulum is near its stops or the end of its scale (common practice, no source). */
export const NEAR_LIMIT = 0.9;

/** How far the pendulum may swing to either side of rest before it touches or leaves the readout, rad; null where the rig document tells neither. */
export function swingRoomRad({ pendulum, readout }: RigDocument): number | null {
  const ranges = [pendulum.travel_rad, readout?.range_rad].filter((range) => range !== undefined);
  return ranges.length === 0 ? null : Math.min(...ranges);
}

/**
 * What it still swings by when a dwell of a period or more has ended, about where the sources pull it to: the fit knows nothing of short knocks, and
 * what it finds has lasted for the whole dwell.
 */
function excursion({ rig, angleDeg, fromUtcMs, toUtcMs }: DwellLook, swing: FreeSwing | null): string | null {
  const roomRad = swingRoomRad(rig);
  const periodS = pendulumOf(rig)?.oscillator.periodS;
  if (swing === null || roomRad === null || periodS === undefined || toUtcMs - fromUtcMs < 1000 * periodS) return null;
  const reachRad = Math.abs(predictEquilibriumRad(rig, angleDeg) ?? 0) + swing.amplitudeRad;
  if (reachRad < NEAR_LIMIT * roomRad) return null;
  return `the pendulum still swings out to ${micro(reachRad)} µrad at the end, and ${micro(roomRad)} µrad are all that it has`;
}

function surroundings(look: DwellLook): string[] {
  return (look.goodWhen?.channels ?? []).flatMap((wanted) => {
    const series = look.channel(wanted.channel);
    if (series === null || series.utcMs.length === 0) return look.simulated ? [] : [`no sample of ${wanted.channel} in this dwell`];
    return channelReadings(wanted, series)
      .filter(({ met }) => !met)
      .map(
        ({ name, value, limit, unit, wanted: side }) =>
          `${name} ${value === null ? 'not known' : `${Number(value.toPrecision(3))} ${unit}`}, not ${side} ${limit} ${unit}`,
      );
  });
}
