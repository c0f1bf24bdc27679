import type { ChainedEvent } from '../archive/run-records';
import type { MorningTick } from '../contracts/morning';
import type { EvaluationResult } from '../evaluation/result';
import { formatDegrees } from '../lib/format-angle';
import { formatDuration } from '../lib/format-duration';
import { formatFixed, formatPercent, formatSignificant } from '../lib/format-number';
import { formatUncertain } from '../lib/format-uncertain';

/** Five things that have to be right before anybody believes the night. */

export interface SampleCover {
  channel: string;
  samples: number;
  /** By the rate of the channel, or else its usual spacing, over the length of the run; null where neither is known. */
  expected: number | null;
  longestGapS: number;
}

export interface RecordFacts {
  events: number;
  /** Sequence number at which the chain breaks; null where it is whole. */
  brokenAt: number | null;
}

export interface TickFacts {
  events: readonly ChainedEvent[];
  /** Greatest shift of the home edge that is no slip, deg. */
  edgeToleranceDeg: number;
  cover: SampleCover | null;
  record: RecordFacts;
  result: EvaluationResult | null;
  /** Run without source masses. */
  control: boolean;
  /** Near minus far that the rig document predicts, rad; null where it cannot. */
  predictedRad: number | null;
}

/** As far off as near minus far may be before it is called unlike the prediction: the limit of a proof (protocol format, `size`). */
const sizeLimit = 0.2;
/** Less than this of the samples is worth a look (no source). */
const enoughSamples = 0.99;

export const morningTicks = (facts: TickFacts): MorningTick[] => [
  firstPair(facts),
  edge(facts),
  samples(facts.cover),
  clock(facts.result),
  record(facts),
];

/** By the proof where there was one, else by near minus far of the whole night. */
function firstPair({ events, result, predictedRad, control }: TickFacts): MorningTick {
  const code = 'first-pair';
  const proof = events.find(({ kind }) => kind === 'proof');
  if (proof !== undefined) {
    const tests = (Array.isArray(proof.data['tests']) ? proof.data['tests'] : []) as { ok: boolean | null; words: string }[];
    const ok = proof.data['sound'] === true;
    const told = tests.filter((test) => ok || test.ok !== true).map(({ words }) => words);
    return { code, ok, words: ok ? 'First pair as predicted' : `First pair not as predicted: ${told.join('; ')}` };
  }
  if (control) return { code, ok: null, words: 'A control: its near − far is tested in the evaluation' };
  const found = result?.reversal_rad?.value ?? null;
  if (found === null || predictedRad === null || predictedRad === 0)
    return { code, ok: null, words: 'No near − far to compare with the prediction yet' };
  const off = found / predictedRad - 1;
  const ok = Math.abs(off) <= sizeLimit;
  const words = `Near − far ${formatPercent(Math.abs(off))} ${off < 0 ? 'below' : 'above'} the prediction, ${uOfRatio(result)}`;
  return { code, ok, words: ok ? words : `${words}, ${formatPercent(sizeLimit)} allowed` };
}

/** Over the prediction near minus far is what G by the equilibria is over the G of the prediction, so that its u holds both that of the night and that of the rig. */
function uOfRatio(result: EvaluationResult | null): string {
  const u = result?.method === 'equilibrium' ? result.relativeU : null;
  return u === null ? 'u not known' : `u ${formatPercent(u)}`;
}

function edge({ events, edgeToleranceDeg }: TickFacts): MorningTick {
  const code = 'edge';
  const slip = events.findLast(({ kind }) => kind === 'table-slipped');
  if (slip !== undefined)
    return { code, ok: false, words: `The table slipped by ${formatDegrees(Math.abs(Number(slip.data['slipDeg'])), 2)}` };
  const passes = events.flatMap(({ kind, data }) => (kind === 'home-edge' && typeof data['slipDeg'] === 'number' ? [data['slipDeg']] : []));
  const tolerance = `${formatDegrees(edgeToleranceDeg, 3)} allowed`;
  if (passes.length === 0) return { code, ok: null, words: `Home edge not passed since homing, ${tolerance}` };
  const most = Math.max(...passes.map(Math.abs));
  return { code, ok: most <= edgeToleranceDeg, words: `Home edge moved ${formatDegrees(most, 3)}, ${tolerance}` };
}

function samples(cover: SampleCover | null): MorningTick {
  const code = 'samples';
  if (cover === null || cover.samples === 0) return { code, ok: cover === null ? null : false, words: 'No deflection within the run yet' };
  const gap = `longest gap ${cover.longestGapS < 60 ? `${formatSignificant(cover.longestGapS, 2)} s` : formatDuration(cover.longestGapS)}`;
  if (cover.expected === null) return { code, ok: null, words: `${cover.samples} samples in ${cover.channel}, ${gap}` };
  const share = Math.min(1, cover.samples / cover.expected);
  return { code, ok: share >= enoughSamples, words: `${formatFixed(100 * share, { decimals: 1 })} % of the samples, ${gap}` };
}

function clock(result: EvaluationResult | null): MorningTick {
  const code = 'clock';
  if (result === null) return { code, ok: null, words: 'Clock of the deflection not evaluated yet' };
  const offset = result.alignment?.clockOffset_s ?? null;
  if (offset === null) return { code, ok: null, words: 'Nothing to tell the clock of the deflection by' };
  const poor = result.warnings.find(({ code: warning }) => warning.startsWith('clock'));
  const words = `Clock off by ${formatUncertain({ ...offset, unit: 's' }, { exponent: 0 })}, ${result.alignment?.applied === true ? 'put right' : 'left as it is'}`;
  return { code, ok: poor === undefined || result.alignment?.applied === true, words };
}

function record({ record: { events, brokenAt }, result }: TickFacts): MorningTick {
  const code = 'record';
  if (brokenAt !== null) return { code, ok: false, words: `The chain of events is broken at event ${brokenAt}` };
  const chain = `Chain of ${events} events whole`;
  if (result === null || result.registered === null) return { code, ok: true, words: chain };
  return result.registered
    ? { code, ok: true, words: `${chain}, as registered` }
    : { code, ok: false, words: `${chain}, but not evaluated as registered` };
}
