import type { Archive } from '../archive/read-archive';
import { channelPath } from '../archive/channel-csv';
import { UnusableArchive } from '../archive/unusable-archive';
import { CODATA_2022_G } from '../physics/constants';
import { inertiaKgM2 } from '../physics/oscillator';
import { SingularMatrixError } from '../statistics/symmetric';
import { analyse, type Analysis } from './analysis';
import { driftsBeside } from './drifts';
import { controlTest } from './empty-control';
import { regressionsOf, type Regressions } from './environment';
import type { Known } from './free-oscillator';
import type { GBasis } from './g-basis';
import { kappaU } from './g-budget';
import { answerOf, foundBy, methodsBeside } from './methods';
import { monteCarlo, type TrialModel } from './monte-carlo';
import { pretendOf } from './pretend';
import { evaluationPlan, type EvaluationOptions, type EvaluationPlan } from './registration';
import type { ControlResult, DwellResult, EvaluationResult, FitCurve } from './result';
import { isMember, type Reversal } from './reversal';
import { centreOf } from './ring-down-fit';
import { NoSolutionError } from './solve-g';
import { hasSwings, registrationWarnings, warningsOf } from './warnings';

export interface Evaluation {
  result: EvaluationResult;
  /** Averaged data and fitted curve of every fitted dwell and ring-down. */
  curves: FitCurve[];
  /** For Monte Carlo trials elsewhere; null where there is nothing to draw. */
  trialModel: TrialModel | null;
  /** For values tried elsewhere; null without a G by equilibria. */
  basis: GBasis | null;
}

/**
 * Evaluates a verified archive by the method that the options or the protocol name: dwell fits or harmonics, κ, and G with its budget.
 * @throws UnusableArchive saying which file and row, and why.
 */
export function evaluateArchive(archive: Archive, options: EvaluationOptions = {}): Evaluation {
  const plan = evaluationPlan(archive, options);
  const whole = analysisOf(archive, plan);
  const analysis = plan.method === 'acceleration' ? whole.byBeginnings() : whole;
  const { reversal } = analysis;
  const { solution, free, budget, trialModel, clockOffset, modulation, basis } = foundBy(archive, plan, analysis);
  const byDwells = plan.method === 'equilibrium' || plan.method === 'acceleration';
  const { regressions, warnings } = byDwells ? regressionsOf(archive, plan, { analysis, budget }) : nothing;
  const found = solution === null ? null : { bigG: solution.bigG, budget };
  const { G, relativeU, En } = found === null ? { G: null, relativeU: null, En: null } : answerOf(found);
  const kappa = { value: inertiaKgM2(archive.rig) * free.omega0Squared.value, u: kappaU(archive.rig, free.omega0Squared) };
  const result: EvaluationResult = {
    formatVersion: 1,
    method: plan.method,
    registered: plan.differences === null ? null : plan.differences.length === 0,
    chain: archive.chain,
    alignment: alignmentOf(plan, clockOffset, { archive, options }),
    period_s: withU(free.period),
    decayTime_s: free.decayTime === null ? null : withU(free.decayTime),
    kappa_N_m: kappa,
    dwells: dwellResults(analysis),
    reversal_rad: reversal === null ? null : reversalResult(reversal, controlTest(archive.rig, analysis, options.boundRad ?? null)),
    G,
    relativeU,
    codata: { ...CODATA_2022_G, En },
    budget: budget?.lines ?? null,
    monteCarlo: trialModel === null ? null : monteCarlo(trialModel, options.trials ?? 0),
    ...(modulation === undefined ? {} : { modulation }),
    ...(hasSwings(archive) || !byDwells ? {} : { pretend: pretendOf(analysis) }),
    ...(regressions.length === 0 ? {} : { regressions }),
    ...(options.besides !== true || found === null ? {} : { methods: methodsBeside(archive, plan, { whole, ...found }) }),
    ...(options.besides !== true || !byDwells || reversal === null ? {} : { drifts: driftsBeside(analysis, plan.order) }),
    warnings: [
      ...archive.warnings,
      ...registrationWarnings(archive, plan),
      ...warningsOf(archive, { ...analysis, solution, clockOffset }, plan),
      ...warnings,
    ],
  };
  return { result, curves: curvesOf(analysis), trialModel, basis };
}

/** Other methods look at no difference of the dwells. */
const nothing: Regressions = { regressions: [], warnings: [] };

interface Asked {
  archive: Archive;
  options: EvaluationOptions;
}

/** The offset is applied where it is more than twice its uncertainty, unless somebody decided otherwise; what the other way would give is tried too. */
function alignmentOf({ clock }: EvaluationPlan, clockOffset: Analysis['clockOffset'], asked: Asked): EvaluationResult['alignment'] {
  const isTold = clockOffset !== null && Math.abs(clockOffset.value) > 2 * clockOffset.u;
  const applied = clock.kind === 'set' || (clock.kind === 'estimated' && isTold);
  const otherS = applied ? 0 : isTold ? clockOffset.value : null;
  return {
    clockOffset_s: clockOffset,
    applied,
    ...(clock.kind === 'estimated' ? {} : { decided: clock }),
    ...(asked.options.besides !== true || otherS === null ? {} : { otherwise: { offset_s: otherS, G: gWith(asked, otherS) } }),
  };
}

/** G with this offset taken off instead; null where there is none. */
function gWith({ archive, options }: Asked, offset_s: number): number | null {
  try {
    const { result } = evaluateArchive(archive, { ...options, besides: false, trials: 0, clock: { kind: 'set', offset_s } });
    return result.G?.value ?? null;
  } catch (error) {
    if (error instanceof UnusableArchive) return null;
    throw error;
  }
}

/** An empty control has a further key for its test of equivalence. */
function reversalResult({ value, known, count }: Reversal, control: ControlResult | null): EvaluationResult['reversal_rad'] {
  return { value, u: known?.u ?? null, count, ...(control === null ? {} : { equivalence: control }) };
}

const withU = ({ value, u }: Known) => ({ value, u });

function analysisOf(archive: Archive, plan: EvaluationPlan): Analysis {
  try {
    return analyse(archive, plan);
  } catch (error) {
    if (error instanceof SingularMatrixError)
      throw new UnusableArchive({ file: channelPath(plan.channel) }, `the dwells cannot be fitted: ${error.message}`);
    if (error instanceof NoSolutionError) throw new UnusableArchive({ file: 'rig.json' }, error.message);
    throw error;
  }
}

function dwellResults({ windows, samplesOf, segments, found }: Analysis): DwellResult[] {
  return windows
    .filter(({ row }) => row.kind === 'dwell')
    .map((window) => {
      const index = segments.findIndex((segment) => segment.window === window);
      const segment = segments[index];
      const centre = segment === undefined || found === null ? null : centreOf(found, index);
      return {
        seq: window.row.seq,
        station: window.station,
        theta_rad: centre === null ? null : { value: centre.value, u: centre.u },
        samples: segment?.averages.samples ?? samplesOf.get(window) ?? 0,
        used: segment !== undefined && isMember(segment),
        why: window.why ?? (window.side === 0 ? 'neither near nor far' : null),
      };
    });
}

function curvesOf({ segments, found }: Analysis): FitCurve[] {
  return segments.map(({ window, averages }, i) => {
    const residuals = found?.fit.segments[i]?.residuals;
    const model = averages.y.map((y, k) => y - (residuals?.[k] ?? 0) / Math.sqrt(averages.weight[k] as number));
    return {
      seq: window.row.seq,
      station: window.station,
      startUtcMs: window.fromUtcMs,
      tS: [...averages.t],
      dataRad: [...averages.y],
      modelRad: [...model],
    };
  });
}
