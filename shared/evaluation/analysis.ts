import type { Archive } from '../archive/read-archive';
import { UnusableArchive } from '../archive/unusable-archive';
import { CODATA_2022_G } from '../physics/constants';
import type { BoxAverages } from '../statistics/box-average';
import type { RingDownData } from '../statistics/ring-down';
import { ringDownStart, type RingDownStart } from '../statistics/ring-down-start';
import { scaleOf, spotOfAngle, withZero, type ChannelScale } from './channel-scale';
import { curvatureBias, withoutBias } from './curvature';
import { averagedAngles, reasonAgainstSamples, samplesIn, type DwellSamples } from './dwell-samples';
import { dwellWindows, lengthS, type DwellWindow } from './dwell-windows';
import { combine, measuredOscillator, type FreeOscillator, type MeasuredOscillator } from './free-oscillator';
import { gSystem } from './g-system';
import type { EvaluationPlan } from './registration';
import { reversalOf, isMember, type Reversal } from './reversal';
import { centreOf, fitRingDown, type DwellFit, type FitBias, type HeldOscillation } from './ring-down-fit';
import { freeAt, solveG, stiffnessShifts, type GSolution, type GSystem } from './solve-g';

/** One window that is fitted, with its averaged data. */
export interface Segment {
  window: DwellWindow;
  averages: BoxAverages;
  /** What the sources add to ω² there, rad2/s2. */
  shift: number;
  /** Instant of the reported centre, s after the window's start. */
  centreS: number;
}

/** Everything that was fitted and solved, before it is put into words. */
export interface Analysis {
  windows: DwellWindow[];
  /** Samples found in each window. */
  samplesOf: Map<DwellWindow, number>;
  segments: Segment[];
  scale: ChannelScale;
  /** Null without a segment. */
  found: DwellFit | null;
  measured: MeasuredOscillator;
  free: FreeOscillator;
  reversal: Reversal | null;
  /** Null where there is no G. */
  solution: GSolution | null;
  system: GSystem | null;
}

/** A dwell that was cut short counts from this many periods on. */
const cutShortPeriods = 1.25;

/** Data are averaged to this many boxes a period before they are fitted. */
const boxesPerPeriod = 60;

/** Changes this small, relative to what they change, count as none. */
const settledRelative = 1e-9;
const settledZeroRad = 1e-12;

/** Reads the channel, fits all dwells and solves for G. @throws UnusableArchive, NoSolutionError */
export function analyse(archive: Archive, plan: EvaluationPlan): Analysis {
  const series = archive.readChannel(plan.channel);
  const scale = scaleOf(series.info, archive.rig);
  const measured = measuredOscillator(archive.rig);
  const windows = dwellWindows(archive.steps, archive.rig);
  const samples = windows.map((window) => samplesIn(window, series, archive.exclusions));
  const samplesOf = new Map(samples.map((one) => [one.window, one.tS.length]));
  const usable = samples.filter(({ window }) => window.why === null);
  const rough = withZero(scale, zeroFrom(usable, scale));
  const start = startOf(usable, rough, measured);
  refuseShort(usable, start === null ? null : (2 * Math.PI) / start.omega);
  const fitted = usable.filter(({ window }) => window.why === null);
  const outcome = iterate({ archive, plan, measured, start, samples: fitted }, rough);
  return { windows, samplesOf, measured, ...outcome };
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

/** Start of the fit; also marks the windows whose samples are too few. */
function startOf(samples: readonly DwellSamples[], scale: ChannelScale, measured: MeasuredOscillator): RingDownStart | null {
  const data: RingDownData[] = [];
  for (const one of samples) {
    const windowS = (one.window.toUtcMs - one.window.fromUtcMs) / 1000;
    const averages = averagedAngles(one, scale, Math.min(5, windowS / 100));
    one.window.why = reasonAgainstSamples(one, averages);
    if (one.window.why === null && one.window.row.outcome !== 'cut short') data.push({ tS: averages.t, y: averages.y });
  }
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

interface FitQuestion {
  archive: Archive;
  plan: EvaluationPlan;
  measured: MeasuredOscillator;
  start: RingDownStart | null;
  samples: readonly DwellSamples[];
}

type FitOutcome = Omit<Analysis, 'windows' | 'samplesOf' | 'measured'>;

/** What one round of fitting takes from the round before. */
interface Round {
  scale: ChannelScale;
  averages: BoxAverages[];
  start: RingDownStart | null;
  shifts: number[];
  bias: FitBias | null;
}

const greatestRounds = 15;

/**
 * The stiffness of the sources depends on G, G on κ, κ on the ring-down freed of that stiffness; the bias of the linear dwell model
 * on all of them; and the zero of a spot scale on the equilibria. All settle in a few rounds.
 */
function iterate(question: FitQuestion, rough: ChannelScale): FitOutcome {
  const widthS = question.start === null ? 5 : (2 * Math.PI) / question.start.omega / boxesPerPeriod;
  const averagesOn = (scale: ChannelScale) => question.samples.map((one) => averagedAngles(one, scale, widthS));
  let round: Round = {
    scale: rough,
    averages: averagesOn(rough),
    start: question.start,
    shifts: question.samples.map(() => 0),
    bias: null,
  };
  for (let count = 1; ; count += 1) {
    const outcome = fitOnce(question, round);
    const next = nextRound(outcome, round, averagesOn);
    if (count === greatestRounds || hasSettled(outcome, round, next)) return outcome;
    round = next;
  }
}

function nextRound(outcome: FitOutcome, round: Round, averagesOn: (scale: ChannelScale) => BoxAverages[]): Round {
  const { segments, found, system, solution } = outcome;
  const zeroRad = zeroOf(round.scale, segments, found);
  const moves = round.scale.kind === 'spot' && Math.abs(zeroRad) > settledZeroRad;
  const scale = moves && round.scale.kind === 'spot' ? withZero(round.scale, spotOfAngle(round.scale, zeroRad)) : round.scale;
  const ringDown = found?.fit.alpha;
  const shifts = system === null ? round.shifts : shiftsAt(system, segments, solution);
  return {
    scale,
    averages: moves ? averagesOn(scale) : round.averages,
    start:
      found === null || found.ringDown === null || ringDown === undefined
        ? round.start
        : { omega: ringDown[0] as number, gamma: ringDown[1] as number },
    shifts,
    bias:
      found === null || system === null || solution === null
        ? null
        : curvatureBias(segments, found, { system, solution, shifts, before: round.bias }),
  };
}

function hasSettled({ free, reversal }: FitOutcome, round: Round, next: Round): boolean {
  const omegaSquared = free.omega0Squared.value;
  const stiffness = next.shifts.every((shift, i) => Math.abs(shift - (round.shifts[i] as number)) < settledRelative * omegaSquared);
  const size = settledRelative * Math.abs(reversal?.value ?? 0);
  const bias = (next.bias?.centres ?? []).every((value, i) => Math.abs(value - (round.bias?.centres[i] ?? 0)) <= size);
  const frequency = Math.abs((next.bias?.omega ?? 0) - (round.bias?.omega ?? 0)) <= settledRelative * Math.sqrt(omegaSquared);
  return stiffness && bias && frequency && next.scale === round.scale;
}

function fitOnce(question: FitQuestion, { scale, averages, start, shifts, bias }: Round): FitOutcome {
  const { archive, plan, measured, samples } = question;
  const segments = samples.map((one, i) => ({
    window: one.window,
    averages: averages[i] as BoxAverages,
    shift: shifts[i] as number,
    centreS: one.centreS,
  }));
  const data = segments.map(({ averages: { t, y, weight }, shift, centreS }) => ({ tS: t, y, weight, centreS, shift }));
  const raw = data.length === 0 ? null : fitRingDown(data, start, heldOf(measured));
  const found = raw === null || bias === null ? raw : withoutBias(raw, bias);
  const free = combine(found?.ringDown ?? null, measured);
  if (free === null) {
    const why = 'the dwells hold no ringing that could be fitted, and rig.json gives no measured.period_s';
    throw new UnusableArchive({ file: null }, `nothing tells the period: ${why}`);
  }
  const reversal = found === null ? null : reversalOf(segments, found, { kind: plan.drift, order: plan.order });
  const system = gSystem({ rig: archive.rig, stationsOf: archive.rig, segments, found, measured, free, reversal });
  const noG = system === null || reversal === null || archive.rig.sources.shape === 'none';
  return { segments, scale, found, free, reversal, solution: noG ? null : solveG(system, CODATA_2022_G.value), system };
}

/** Without a G of its own the run is freed of the sources' stiffness with the recommended G. */
function shiftsAt(system: GSystem, segments: readonly Segment[], solution: GSolution | null): number[] {
  const bigG = solution?.bigG ?? CODATA_2022_G.value;
  const kappa = solution?.kappa ?? system.inertiaKgM2 * freeAt(system, bigG).omega0Squared;
  return stiffnessShifts(system, { bigG, kappa, angles: segments.map(({ window }) => ((window.angleDeg ?? 0) * Math.PI) / 180) });
}

function heldOf({ omega, gamma }: MeasuredOscillator): HeldOscillation | null {
  if (omega === null) return null;
  return {
    omega: omega.value,
    gamma: gamma?.value ?? 0,
    covariance: [
      [omega.u ** 2, 0],
      [0, (gamma?.u ?? 0) ** 2],
    ],
  };
}

/** Angle that a spot scale shows midway between the equilibria; it must become 0 where no zero is given. */
function zeroOf(scale: ChannelScale, segments: readonly Segment[], found: DwellFit | null): number {
  if (scale.kind === 'angle' || scale.zeroGiven || found === null || segments.length === 0) return 0;
  const centres = segments.map((segment, i) => ({ side: isMember(segment) ? segment.window.side : 0, value: centreOf(found, i).value }));
  const meanOfSide = (side: number) => {
    const own = centres.filter((one) => one.side === side);
    return own.length === 0 ? null : own.reduce((sum, { value }) => sum + value, 0) / own.length;
  };
  const sides = [meanOfSide(1), meanOfSide(-1)].filter((one) => one !== null);
  return sides.length > 0 ? sides.reduce((a, b) => a + b, 0) / sides.length : (meanOfSide(0) ?? 0);
}
