import { oscillatorOf } from '../physics/oscillator';
import { fittedRecording } from '../planning/fitted-recording';
import type { RigDocument } from '../rig/document';
import { adviseDocument } from './advise-document';
import { shapedPeriodUnknown } from './advise-parts';
import { adviseSurroundings, type Surroundings } from './advise-surroundings';
import type { ProtocolDocument } from './document';
import { type Finding, withoutRepeats } from './finding';
import { sideAt } from './stations';
import { walkSteps } from './step-path';
import { planTimeline, type TimelineItem } from './timeline';

export interface AdviceStart extends Surroundings {
  utcMs: number;
  /** Turntable angle, deg. */
  angleDeg: number;
  /** IANA zone of the lab (default UTC). */
  timeZone?: string;
}

/** Within this many periods of an odd number of half periods a beat pumps. */
const pumpingMargin = 0.2;
/** Ringing that has died down to this fraction by the next swing adds nothing that matters. */
const negligibleMemory = 0.05;
/** Shortest useful dwell in periods, without and with a ring-down that gives period and decay. */
const shortestDwell = { alone: 1.25, withRingDown: 0.9 };
/** Near and far dwells count as equally long within this fraction. */
const equalLengths = 0.05;

/**
 * Where a protocol that can be carried out is weak: `cycle-pumps`, `dwell-short`, `no-ring-down`, `unequal-sides`, `drift-not-cancelled`,
 * `other-side`, `shaped-period-unknown`, and what `adviseDocument` and `adviseSurroundings` find. Each message is two sentences, the number that triggered it and what would be better. Takes drafts; what cannot be told from them is left unsaid.
 */
export function adviseProtocol(document: ProtocolDocument, rig: RigDocument, start: AdviceStart): Finding[] {
  const timeZone = start.timeZone ?? 'UTC';
  const { items, startUtcMs, endUtcMs } = planTimeline({ protocol: document, rig, timeZone }, start);
  const hasRingDown = [...walkSteps(document.steps)].some(({ step }) => step.kind === 'kick');
  const sides = sidesOf(items, rig);
  return withoutRepeats([
    ...onePerStep(cyclePumps(items, rig)),
    ...onePerStep(dwellShort(items, rig, hasRingDown)),
    ...(hasRingDown ? [] : noRingDown(sides, rig)),
    ...unequalSides(sides),
    ...driftNotCancelled(sides),
    ...onePerStep(otherSide(items, rig)),
    ...shapedPeriodUnknown(document, rig),
    ...adviseDocument(document, rig),
    ...adviseSurroundings(start, {
      protocol: document,
      startUtcMs,
      endUtcMs,
      timeZone,
      reverses: new Set(sides.map(({ side }) => side)).size > 1,
    }),
  ]);
}

/** A step in a repeat is met in every pass; the first pass speaks for all. */
function onePerStep(findings: Finding[]): Finding[] {
  const seen = new Set<string | null>();
  return findings.filter(({ path }) => !seen.has(path) && seen.add(path));
}

const durationS = ({ startUtcMs, endUtcMs }: TimelineItem) => (endUtcMs - startUtcMs) / 1000;
const periodOf = (rig: RigDocument) => rig.measured?.period_s?.value ?? null;

function cyclePumps(items: readonly TimelineItem[], rig: RigDocument): Finding[] {
  const periodS = periodOf(rig);
  if (periodS === null) return [];
  return beatsOf(items).flatMap(({ beatS, longest }) => {
    const beat = beatS / periodS;
    const pumps = Math.abs(beat - Math.floor(beat) - 0.5) <= pumpingMargin + 1e-9;
    if (!pumps || memoryAfter(rig, beatS) < negligibleMemory) return [];
    const whole = Math.ceil(beat);
    const betterS = durationS(longest) + whole * periodS - beatS;
    const message =
      `From swing to swing it takes ${beatS.toFixed(0)} s, ${beat.toFixed(2)} periods, which is near an odd number of half periods, so each swing adds to the ringing of the one before. ` +
      `A beat of ${whole} whole period${whole === 1 ? '' : 's'} does not: make this ${longest.kind} ${betterS.toFixed(1)} s long${longest.kind === 'dwell' ? `, or give it beat_periods ${whole}` : ''}.`;
    return [{ code: 'cycle-pumps', path: longest.documentPath, message }];
  });
}

/** What is left of a ringing after a time in s; all of it where the decay is not known. */
function memoryAfter(rig: RigDocument, seconds: number): number {
  const oscillator = oscillatorOf(rig);
  return oscillator === null ? 1 : Math.exp(-oscillator.gamma * seconds);
}

interface Beat {
  /** From the start of one swing to the start of the next, s. */
  beatS: number;
  /** The longest dwell or settle in it. */
  longest: TimelineItem;
}

/** From swing to swing, where nothing but standing still at a planned length lies between. */
function beatsOf(items: readonly TimelineItem[]): Beat[] {
  const beats: Beat[] = [];
  let begin: TimelineItem | null = null;
  let longest: TimelineItem | null = null;
  for (const item of items) {
    // A shaped swing leaves nothing that the next could add to.
    if (item.part !== undefined) begin = null;
    else if (item.kind === 'swing' && item.angleFromDeg !== item.angleToDeg && item.documentPath !== 'atEnd.swing') {
      if (begin !== null && longest !== null) beats.push({ beatS: (item.startUtcMs - begin.startUtcMs) / 1000, longest });
      begin = item;
      longest = null;
    } else if (item.kind === 'dwell' || item.kind === 'settle') {
      if (longest === null || durationS(item) > durationS(longest)) longest = item;
    } else if (item.kind !== 'mark' && item.kind !== 'swing') begin = null;
  }
  return beats;
}

function dwellShort(items: readonly TimelineItem[], rig: RigDocument, hasRingDown: boolean): Finding[] {
  const periodS = periodOf(rig);
  if (periodS === null) return [];
  const least = hasRingDown ? shortestDwell.withRingDown : shortestDwell.alone;
  return items
    .filter((item) => item.kind === 'dwell' && durationS(item) / periodS < least - 1e-9)
    .map((item) => ({
      code: 'dwell-short',
      path: item.documentPath,
      message:
        `This dwell lasts ${durationS(item).toFixed(0)} s, ${(durationS(item) / periodS).toFixed(2)} periods, and below ${least} periods the centre of the swinging can hardly be told from the swinging itself. ` +
        `Make it at least ${(least * periodS).toFixed(0)} s long.`,
    }));
}

/** From this loss of u on a ring-down is worth its time: above what dwells of two periods lose (physics.md C4: √(1.2012/1.0089)). */
const worthARingDown = 1.1;

/** Reversals whose dwells have to tell period and decay as well, where that costs more than a tenth of u. */
function noRingDown(dwells: readonly SideDwell[], rig: RigDocument): Finding[] {
  const oscillator = oscillatorOf(rig);
  const shortest = Math.min(...dwells.map((dwell) => dwell.durationS));
  if (oscillator === null || new Set(dwells.map(({ side }) => side)).size < 2 || !(shortest > 0)) return [];
  const { inflation, inflationAlone } = fittedRecording(oscillator, shortest);
  const loss = Math.sqrt(inflationAlone() / inflation);
  if (!(loss > worthARingDown)) return [];
  return [
    {
      code: 'no-ring-down',
      path: null,
      message:
        `Nothing kicks the pendulum, so period and decay come from dwells of ${(shortest / oscillator.periodS).toFixed(2)} periods alone, which makes the uncertainty of each ${loss.toPrecision(3)} times that with a ring-down. ` +
        'Put a kick before the first pair and after the last, or make the dwells two periods long.',
    },
  ];
}

interface SideDwell {
  side: 'near' | 'far';
  durationS: number;
}

/** The near and far dwells; none where most dwells stand elsewhere, as in a scan: that is no series of reversals. */
function sidesOf(items: readonly TimelineItem[], rig: RigDocument): SideDwell[] {
  const dwells = items.filter(({ kind }) => kind === 'dwell');
  const sides = dwells.flatMap((item) => {
    const side = sideAt(rig, item.angleToDeg);
    return side === null ? [] : [{ side, durationS: durationS(item) }];
  });
  return 2 * sides.length >= dwells.length ? sides : [];
}

function unequalSides(dwells: readonly SideDwell[]): Finding[] {
  const near = dwells.filter(({ side }) => side === 'near');
  const far = dwells.filter(({ side }) => side === 'far');
  if (near.length === 0 || far.length === 0) return [];
  const advice = (message: string): Finding[] => [{ code: 'unequal-sides', path: null, message }];
  if (Math.abs(near.length - far.length) > 1) {
    return advice(
      `There are ${near.length} near dwells and ${far.length} far dwells. Plan as many of the one as of the other, or one more: the side with fewer decides the uncertainty.`,
    );
  }
  const mean = (side: readonly SideDwell[]) => side.reduce((sum, dwell) => sum + dwell.durationS, 0) / side.length;
  const [nearS, farS] = [mean(near), mean(far)];
  if (Math.abs(nearS - farS) <= equalLengths * Math.max(nearS, farS)) return [];
  return advice(
    `Near dwells last ${nearS.toFixed(0)} s on average, far dwells ${farS.toFixed(0)} s. Make them equally long: the shorter side decides the uncertainty, and what is wrong with a fit is then alike on both sides.`,
  );
}

function driftNotCancelled(dwells: readonly SideDwell[]): Finding[] {
  const near = dwells.filter(({ side }) => side === 'near').length;
  if (near === 0 || near === dwells.length) return [];
  const advice = (message: string): Finding[] => [{ code: 'drift-not-cancelled', path: null, message }];
  const same = dwells.findIndex((dwell, index) => dwell.side === dwells[index + 1]?.side);
  if (same !== -1) {
    return advice(
      `Near and far dwells do not alternate: dwells ${same + 1} and ${same + 2} of the series both stand on the ${dwells[same]?.side} side. Drift is taken out between neighbours on opposite sides, so change sides from each dwell to the next.`,
    );
  }
  if (dwells.length >= 3) return [];
  return advice(
    `With ${dwells.length} dwells there is no telling drift from signal. Plan at least 3 in alternation, such as near, far, near.`,
  );
}

/** Swings that reach a station from the side from which its angle was not measured: the backlash of the drive lies between the two. */
function otherSide(items: readonly TimelineItem[], rig: RigDocument): Finding[] {
  return items.flatMap((item) => {
    const wanted = item.kind === 'swing' ? rig.stations[item.station]?.approach : undefined;
    const wayDeg = item.angleToDeg - item.angleFromDeg;
    if (wanted === undefined || wayDeg === 0 || (wanted === 'ccw') === wayDeg > 0) return [];
    const [words, came] = wanted === 'ccw' ? ['counter-clockwise', 'clockwise'] : ['clockwise', 'counter-clockwise'];
    const message =
      `The station ${item.station} is meant to be reached ${words}, and this swing reaches it ${came}, so the backlash of the drive adds to its angle. ` +
      'Swing past it first, or come from its other side.';
    return [{ code: 'other-side', path: item.documentPath, message }];
  });
}
