import type { ProtocolDocument } from '../protocol/document';
import { sideAt } from '../protocol/stations';
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
}

export interface DwellLook {
  rig: RigDocument;
  goodWhen: ProtocolDocument['goodWhen'];
  seq: number;
  fromUtcMs: number;
  /** Planned end. */
  toUtcMs: number;
  angleDeg: number;
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
  const why = [...silence(look), ...disturbance(swing), ...residual(look, swing), ...surroundings(look)];
  return {
    seq,
    side: sideAt(rig, angleDeg),
    midUtcMs: (fromUtcMs + toUtcMs) / 2,
    centreRad: swing?.centreRad ?? null,
    residualRad: swing?.residualRad ?? null,
    period: swing?.period ?? null,
    good: why.length === 0,
    why,
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
