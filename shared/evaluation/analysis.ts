import type { Archive, ArchivedSeries } from '../archive/read-archive';
import type { ChannelCalibration } from '../archive/run-records';
import type { RingDownData } from '../statistics/ring-down';
import { fineOffset } from './fine-offset';
import { iterate } from './fit-rounds';
import { ringDownStart, type RingDownStart } from '../statistics/ring-down-start';
import { scaleOf, withZero, type ChannelScale } from './channel-scale';
import { coarseOffset, type ClockOffset } from './clock-offset';
import { averagedAngles, reasonAgainstSamples, beginningOf, samplesIn, type DwellSamples } from './dwell-samples';
import { dwellWindows, lengthS, type DwellWindow } from './dwell-windows';
import { measuredOscillator, type FreeOscillator, type Known, type MeasuredOscillator } from './free-oscillator';
import type { ClockChoice } from './clock-choice';
import type { EvaluationPlan } from './registration';
import { type Reversal } from './reversal';
import { type Segment } from './segment';
import { type DwellFit } from './ring-down-fit';
import { type GSolution, type GSystem } from './solve-g';

/** Everything that was fitted and solved, before it is put into words. */
export interface Analysis {
  windows: DwellWindow[];
  /** Null where no swing tells it. */
  clockOffset: ClockOffset | null;
  /** Samples found in each window. */
  samplesOf: Map<DwellWindow, number>;
  segments: Segment[];
  /** Where the fit was begun; null where the data suggest nothing. */
  start: RingDownStart | null;
  scale: ChannelScale;
  /** Of the channel; null where it has none. */
  calibration: ChannelCalibration | null;
  /** Null without a segment. */
  found: DwellFit | null;
  measured: MeasuredOscillator;
  free: FreeOscillator;
  reversal: Reversal | null;
  /** Null where there is no G. */
  solution: GSolution | null;
  system: GSystem | null;
  /** The same by the first motion after each swing, with the full step response of a pendulum that the whole dwells tell. */
  byBeginnings(): Analysis;
}

/** A dwell that was cut short counts from this many periods on. */
const cutShortPeriods = 1.25;

/**
 * Reads the channel, fits all dwells and solves for G. The channel's clock is compared with the log's and put right where the
 * two differ by more than the guards about the swings cover; a smaller difference does nothing to a fit with free phase (physics.md H2).
 * @throws UnusableArchive, NoSolutionError
 */
export function analyse(archive: Archive, plan: EvaluationPlan): Analysis {
  const series = archive.readChannel(plan.channel);
  const first = analyseAt(archive, plan, { series, offsetS: 0, judge: false });
  const coarse = coarseOffset({ archive, ...first });
  const wayOff = coarse !== null && Math.abs(coarse.value) > greatestUnnoticedS ? coarse : null;
  const near = wayOff === null ? first : analyseAt(archive, plan, { series, offsetS: wayOff.value, judge: false });
  const best = (at: typeof near, shiftS: number) => {
    const fine = fineOffset({ archive, ...at });
    const whole = fine === null ? null : { value: shiftS + fine.value, u: fine.u };
    return whole === null || (wayOff !== null && wayOff.u < whole.u) ? wayOff : whole;
  };
  const found = best(near, wayOff?.value ?? 0);
  const offsetS = takenOff(plan.clock, found);
  const last = analyseAt(archive, plan, { series, offsetS, judge: true, start: near.start });
  const whole = { ...last, clockOffset: best(last, offsetS) };
  const analysis: Analysis = { ...whole, byBeginnings: () => ({ ...analysis, ...last.begun() }) };
  return analysis;
}

/** What is taken off the channel's clock, s. */
function takenOff(choice: ClockChoice, found: ClockOffset | null): number {
  if (choice.kind !== 'estimated') return choice.kind === 'set' ? choice.offset_s : 0;
  return found !== null && Math.abs(found.value) > Math.max(2 * found.u, guardedS) ? found.value : 0;
}

/** A coarse offset below this may be none, s; the fine search finds it. */
const greatestUnnoticedS = 2;
/** A smaller offset changes nothing: the phase of each dwell is free and its ends are guarded, s. */
const guardedS = 1;

/** Share of a period in which the acceleration is taken. */
const accelerationPeriods = 0.6;

const omegaOf = ({ value, u, nu }: Known): Known => ({ value: (2 * Math.PI) / value, u: (2 * Math.PI * u) / value ** 2, nu });

function analyseAt(
  archive: Archive,
  plan: EvaluationPlan,
  { series, offsetS, judge, start: found }: { series: ArchivedSeries; offsetS: number; judge: boolean; start?: RingDownStart | null },
): Omit<Analysis, 'clockOffset' | 'byBeginnings'> & { begun(): Partial<Analysis> } {
  const scale = scaleOf(series.info, archive.rig);
  const measured = measuredOscillator(archive.rig);
  const windows = dwellWindows(archive.steps, archive.rig);
  const inLogTime = { ...series, utcMs: offsetS === 0 ? series.utcMs : series.utcMs.map((ms) => ms - 1000 * offsetS) };
  const samples = windows.map((window) => samplesIn(window, inLogTime, archive.exclusions));
  const samplesOf = new Map(samples.map((one) => [one.window, one.tS.length]));
  const usable = samples.filter(({ window }) => window.why === null);
  const rough = withZero(scale, zeroFrom(usable, scale));
  const data = toStartFrom(usable, rough);
  const start = found === undefined ? startOf(data, measured) : found;
  refuseShort(usable, start === null ? null : (2 * Math.PI) / start.omega);
  const fitted = usable.filter(({ window }) => window.why === null);
  const whole = iterate({ archive, plan, measured, start, samples: fitted, judge }, rough);
  const begun = () => {
    const beginnings = fitted.map((one) => beginningOf(one, accelerationPeriods * whole.free.period.value));
    const held: MeasuredOscillator = { omega: omegaOf(whole.free.period), gamma: whole.free.gamma };
    return { measured: held, ...iterate({ archive, plan, measured: held, start: null, samples: beginnings, judge }, rough) };
  };
  return { windows, samplesOf, measured, start, calibration: series.info.calibration ?? null, ...whole, begun };
}

/** First guess of a spot scale's zero, m: midway between the mean readings of near and far. */
function zeroFrom(samples: readonly DwellSamples[], scale: ChannelScale): number {
  if (scale.kind === 'angle') return 0;
  if (scale.zeroGiven) return scale.lever.zeroM;
  const means = [1, -1, 0].map((side) => {
    const own = samples.filter(({ window, tS }) => window.side === side && tS.length > 0);
    return own.length === 0
      ? null
      : own.reduce((sum, { reading }) => sum + reading.reduce((a, b) => a + b, 0) / reading.length, 0) / own.length;
  });
  const [near, far, other] = means as [number | null, number | null, number | null];
  const sides = [near, far].filter((one) => one !== null);
  const reading = sides.length > 0 ? sides.reduce((a, b) => a + b, 0) / sides.length : (other ?? 0);
  return reading * scale.metresPerUnit;
}

/** What the start of the fit is found from; marks the windows whose samples are too few. */
function toStartFrom(samples: readonly DwellSamples[], scale: ChannelScale): RingDownData[] {
  const data: RingDownData[] = [];
  for (const one of samples) {
    const windowS = (one.window.toUtcMs - one.window.fromUtcMs) / 1000;
    const averages = averagedAngles(one, scale, Math.min(5, windowS / 100));
    one.window.why = reasonAgainstSamples(one, averages);
    if (one.window.why === null && one.window.row.outcome !== 'cut short') data.push({ tS: averages.t, y: averages.y });
  }
  return data;
}

function startOf(data: readonly RingDownData[], measured: MeasuredOscillator): RingDownStart | null {
  const hint =
    measured.omega === null ? null : { omega: measured.omega.value, gamma: measured.gamma?.value ?? 0.05 * measured.omega.value };
  return ringDownStart(data, hint) ?? hint;
}

function refuseShort(samples: readonly DwellSamples[], periodS: number | null): void {
  for (const { window } of samples) {
    if (window.why !== null || window.row.outcome !== 'cut short') continue;
    if (periodS === null || lengthS(window) < cutShortPeriods * periodS) window.why = `cut short, under ${cutShortPeriods} periods`;
  }
}
