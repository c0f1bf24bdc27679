import type { Archive } from '../archive/read-archive';
import { UnusableArchive } from '../archive/unusable-archive';
import { CODATA_2022_G } from '../physics/constants';
import type { BoxAverages } from '../statistics/box-average';
import { SingularMatrixError } from '../statistics/symmetric';
import { type RingDownStart } from '../statistics/ring-down-start';
import { spotOfAngle, withZero, type ChannelScale } from './channel-scale';
import { curvatureBias, withoutBias } from './curvature';
import { averagedAngles, type DwellSamples } from './dwell-samples';
import { judged, looseningOf, type Disturbance } from './disturbances';
import { combine, type MeasuredOscillator } from './free-oscillator';
import { gSystem } from './g-system';
import type { EvaluationPlan } from './registration';
import { reversalOf, isMember } from './reversal';
import { dataOf, type Segment } from './segment';
import { centreOf, fitRingDown, loosened, type DwellFit, type FitBias, type HeldOscillation } from './ring-down-fit';
import { freeAt, solveG, stiffnessShifts, type GSolution, type GSystem } from './solve-g';
import type { Analysis } from './analysis';

/** Data are averaged to this many boxes a period before they are fitted. */
const boxesPerPeriod = 60;

/** Changes this small, relative to what they change, count as none; before the clocks are compared, and after. */
const settledRelative = { roughly: 1e-5, finally: 1e-9 };

const settledZeroRad = 1e-12;

export interface FitQuestion {
  archive: Archive;
  plan: EvaluationPlan;
  measured: MeasuredOscillator;
  start: RingDownStart | null;
  samples: readonly DwellSamples[];
  /** Whether disturbed data are sought and trusted less, and all rounds gone until nothing changes; else a look at the clock is all that is wanted. */
  judge: boolean;
}

export type FitOutcome = Omit<Analysis, 'windows' | 'samplesOf' | 'measured' | 'clockOffset' | 'start' | 'calibration' | 'byBeginnings'>;

/** What one round of fitting takes from the round before. */
interface Round {
  /** Null where nothing was disturbed. */
  disturbances: Disturbance[] | null;
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
export function iterate(question: FitQuestion, rough: ChannelScale): FitOutcome {
  const widthS = question.start === null ? 5 : (2 * Math.PI) / question.start.omega / boxesPerPeriod;
  const averagesOn = (scale: ChannelScale) => question.samples.map((one) => averagedAngles(one, scale, widthS));
  let round: Round = {
    disturbances: null,
    scale: rough,
    averages: averagesOn(rough),
    start: question.start,
    shifts: question.samples.map(() => 0),
    bias: null,
  };
  let best = settle(question, round, averagesOn);
  for (let judgements = 0; question.judge && judgements < greatestJudgements; judgements += 1) {
    const { outcome, next } = best;
    const disturbances = outcome.found === null ? null : judged(outcome.segments, outcome.found, judgements);
    if (disturbances === null || isAsBefore(disturbances, next.disturbances)) break;
    round = { ...next, disturbances, bias: withKnocks(next, disturbances) };
    const better = settledOrNull(question, round, averagesOn);
    if (better === null) break;
    best = better;
  }
  return best.outcome;
}

/** Null where too little is left of the disturbed data to tell the ringing by. */
function settledOrNull(...[question, round, averagesOn]: Parameters<typeof settle>): Settled | null {
  try {
    const settled = settle(question, round, averagesOn);
    return settled.outcome.found?.ringDown === null ? null : settled;
  } catch (error) {
    if (error instanceof UnusableArchive || error instanceof SingularMatrixError) return null;
    throw error;
  }
}

interface Settled {
  outcome: FitOutcome;
  next: Round;
}

/** Huber's weights twice, then the biweight. */
const greatestJudgements = 6;
const sameTrust = 0.05;

function isAsBefore(now: readonly Disturbance[], before: readonly Disturbance[] | null): boolean {
  return (
    before !== null &&
    now.every(({ trust, knocksS }, i) => {
      const old = before[i];
      if (old === undefined || old.knocksS.length !== knocksS.length) return false;
      return (trust ?? []).every((value, k) => Math.abs(value - (old.trust?.[k] ?? 1)) < sameTrust);
    })
  );
}

/** A bias goes with the columns it was found with; where a knock was added it begins anew. */
function withKnocks({ bias, disturbances: before }: Round, now: readonly Disturbance[]): FitBias | null {
  const same = now.every(({ knocksS }, i) => knocksS.length === (before?.[i]?.knocksS.length ?? 0));
  return same ? bias : null;
}

function settle(question: FitQuestion, first: Round, averagesOn: (scale: ChannelScale) => BoxAverages[]): Settled {
  let round = first;
  const within = question.judge ? settledRelative.finally : settledRelative.roughly;
  for (let count = 1; ; count += 1) {
    const outcome = fitOnce(question, round);
    const next = nextRound(outcome, round, averagesOn);
    if (count === greatestRounds || hasSettled(outcome, { round, next, within })) return { outcome, next };
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
    disturbances: round.disturbances,
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

function hasSettled({ free, reversal }: FitOutcome, { round, next, within }: { round: Round; next: Round; within: number }): boolean {
  const omegaSquared = free.omega0Squared.value;
  const stiffness = next.shifts.every((shift, i) => Math.abs(shift - (round.shifts[i] as number)) < within * omegaSquared);
  const size = within * Math.abs(reversal?.value ?? 0);
  const bias = (next.bias?.centres ?? []).every((value, i) => Math.abs(value - (round.bias?.centres[i] ?? 0)) <= size);
  const frequency = Math.abs((next.bias?.omega ?? 0) - (round.bias?.omega ?? 0)) <= within * Math.sqrt(omegaSquared);
  return stiffness && bias && frequency && next.scale === round.scale;
}

function fitOnce(question: FitQuestion, { scale, averages, start, shifts, bias, disturbances }: Round): FitOutcome {
  const { archive, plan, measured, samples } = question;
  const segments = samples.map((one, i) => ({
    window: one.window,
    averages: averages[i] as BoxAverages,
    shift: shifts[i] as number,
    centreS: one.centreS,
    knocksS: disturbances?.[i]?.knocksS ?? [],
    trust: disturbances?.[i]?.trust ?? null,
  }));
  const data = segments.map(dataOf);
  const fitted = data.length === 0 ? null : fitRingDown(data, start, heldOf(measured));
  const raw = fitted === null ? null : loosened(fitted, looseningOf(disturbances));
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
