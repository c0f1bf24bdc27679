import type { Archive } from '../archive/read-archive';
import type { ArchiveWarning } from '../archive/archive-types';
import { channelPath } from '../archive/channel-csv';
import { UnusableArchive } from '../archive/unusable-archive';
import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { SingularMatrixError } from '../statistics/symmetric';
import { leverOf } from '../physics/lever';
import { inertiaKgM2 } from '../physics/oscillator';
import { geometryOf, torquePerG } from '../physics/torque';
import type { RigDocument } from '../rig/document';
import { analyse, type Analysis } from './analysis';
import { relativeTorqueChange } from './axis-offset';
import { budgetOf, type Budget, type GOf } from './budget';
import { budgetInputs, derivativeStep } from './budget-inputs';
import { reread } from './channel-scale';
import type { Known } from './free-oscillator';
import { gSystem } from './g-system';
import { evaluationPlan, type EvaluationOptions, type EvaluationPlan } from './registration';
import type { DwellResult, EvaluationResult, FitCurve } from './result';
import { isMember, type Reversal } from './reversal';
import { centreOf } from './ring-down-fit';
import { NoSolutionError, solveG } from './solve-g';

export interface Evaluation {
  result: EvaluationResult;
  /** Averaged data and fitted curve of every fitted dwell and ring-down. */
  curves: FitCurve[];
}

/** From this many near and far dwells on their scatter says something. */
const enoughDwells = 6;
const greatestDisagreement = 3;

/**
 * Evaluates a verified archive by the equilibrium method: dwell fits, drift-free difference, κ and G with the linear budget.
 * @throws UnusableArchive saying which file and row, and why; NotYetError for what this version does not do.
 */
export function evaluateArchive(archive: Archive, options: EvaluationOptions = {}): Evaluation {
  const plan = evaluationPlan(archive, options);
  const analysis = analysisOf(archive, plan);
  const budget = budgetFor(archive.rig, analysis);
  const { solution, reversal, free } = analysis;
  const u = budget?.u ?? null;
  const kappa = { value: inertiaKgM2(archive.rig) * free.omega0Squared.value, u: kappaU(archive.rig, free.omega0Squared) };
  const result: EvaluationResult = {
    formatVersion: 1,
    method: plan.method,
    registered: plan.registered,
    chain: archive.chain,
    alignment: null,
    period_s: withU(free.period),
    decayTime_s: free.decayTime === null ? null : withU(free.decayTime),
    kappa_N_m: kappa,
    dwells: dwellResults(analysis),
    reversal_rad: reversalResult(archive.rig, reversal),
    G: solution === null ? null : { value: solution.bigG, u, degreesOfFreedom: finiteOrNull(budget?.degreesOfFreedom) },
    relativeU: solution === null || u === null || solution.bigG === 0 ? null : u / Math.abs(solution.bigG),
    codata: {
      ...CODATA_2022_G,
      En: solution === null || u === null ? null : (solution.bigG - CODATA_2022_G.value) / (2 * Math.hypot(u, CODATA_2022_G.u)),
    },
    budget: budget?.lines ?? null,
    monteCarlo: null,
    ...(hasSwings(archive) ? {} : { pretend: null }),
    warnings: [...archive.warnings, ...warningsOf(archive, analysis)],
  };
  return { result, curves: curvesOf(analysis) };
}

/** An empty control has a further key for its test of equivalence to zero, which is not built yet. */
function reversalResult(rig: RigDocument, reversal: Reversal | null): EvaluationResult['reversal_rad'] {
  if (reversal === null) return null;
  const difference = { value: reversal.value, u: reversal.known?.u ?? null, count: reversal.count };
  return rig.sources.shape === 'none' ? { ...difference, equivalence: null } : difference;
}

const withU = ({ value, u }: Known) => ({ value, u });
const finiteOrNull = (value: number | undefined) => (value === undefined || !Number.isFinite(value) ? null : value);

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

function budgetFor(rig: RigDocument, analysis: Analysis): Budget | null {
  const { solution, reversal, free } = analysis;
  if (solution === null || reversal === null || reversal.known === null) return null;
  const stations = [...new Set(reversal.members.map(({ segment }) => analysis.segments[segment]?.window.stationKey ?? null))].filter(
    (key) => key !== null,
  );
  return budgetOf({
    rig,
    bigG: solution.bigG,
    gOf: gFunction(rig, analysis, solution.bigG),
    stations,
    lever: analysis.scale.kind === 'spot',
    reversal: reversal.known,
    period: free.period,
    decayTime: free.decayTime,
    axisOffset: axisOffsetOf(rig),
  });
}

/** G of the same observations for a rig, a difference or a pendulum supposed otherwise. */
function gFunction(rig: RigDocument, analysis: Analysis, bigG: number): GOf {
  const { segments, found, measured, free, reversal, scale } = analysis;
  const centres = segments.map((_, i) => (found === null ? 0 : centreOf(found, i).value));
  return ({ rig: supposed = rig, reversalRad, periodS, decayTimeS }) => {
    const lever = leverOf(supposed);
    const rereadRad = (reversal?.members ?? []).reduce(
      (sum, { segment, weight }) => sum + weight * reread(scale, centres[segment] as number, lever),
      0,
    );
    const system = gSystem({
      rig: supposed,
      stationsOf: rig,
      segments,
      found,
      measured,
      free,
      reversal,
      reversalRad: reversalRad ?? (scale.kind === 'angle' ? (reversal?.value ?? 0) : rereadRad),
      ...(periodS === undefined || decayTimeS === undefined ? {} : { oscillator: { periodS, decayTimeS } }),
    });
    if (system === null) throw new NoSolutionError('there is no source on the turntable');
    return solveG(system, bigG).bigG;
  };
}

function axisOffsetOf(rig: RigDocument): { value: number; u: number; relative: number } | null {
  const offset = rig.axis?.offset;
  const near = rig.stations.near?.value;
  const far = rig.stations.far?.value;
  if (offset === undefined || near === undefined || far === undefined) return null;
  const stations = { nearRad: near * RAD_PER_DEG, farRad: far * RAD_PER_DEG };
  return {
    value: offset.value,
    u: offset.u,
    relative: relativeTorqueChange(geometryOf(rig), stations, Math.hypot(offset.value, offset.u)),
  };
}

/** u of κ = I ω₀², N m/rad: from the frequency and from everything that the inertia is made of. */
function kappaU(rig: RigDocument, omega0Squared: Known): number {
  const byGroup = new Map<string, number>();
  for (const { path, quantity, shifted } of budgetInputs(rig, { stations: [], lever: false })) {
    if (!path.startsWith('pendulum.')) continue;
    const step = derivativeStep(quantity);
    const slope = (inertiaKgM2(shifted(step)) - inertiaKgM2(shifted(-step))) / (2 * step);
    const key = quantity.group === undefined ? path : `group ${quantity.group}`;
    byGroup.set(key, (byGroup.get(key) ?? 0) + slope * quantity.u);
  }
  const inertiaU = Math.hypot(0, ...byGroup.values());
  return Math.hypot(inertiaKgM2(rig) * omega0Squared.u, inertiaU * omega0Squared.value);
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

const hasSwings = ({ steps }: Archive) => steps.some(({ kind }) => kind === 'swing');

const noReversal: ArchiveWarning = {
  code: 'few-dwells',
  message: 'No near and far dwell that count follow each other, so there is neither a difference nor a G.',
};

function warningsOf(archive: Archive, { reversal, free, solution }: Analysis): ArchiveWarning[] {
  const warnings: ArchiveWarning[] = [];
  const { omega, gamma } = free.disagreement;
  if (omega !== null && omega > greatestDisagreement) {
    warnings.push({
      code: 'period-disagrees',
      message: `The ring-down and measured.period_s of rig.json disagree by ${omega.toFixed(1)} u; their weighted mean was used.`,
    });
  }
  if (gamma !== null && gamma > greatestDisagreement) {
    warnings.push({
      code: 'decay-disagrees',
      message: `The ring-down and measured.decayTime_s of rig.json disagree by ${gamma.toFixed(1)} u; their weighted mean was used.`,
    });
  }
  if (free.decayTime === null) {
    warnings.push({
      code: 'decay-unknown',
      message:
        'Neither the dwells nor measured.decayTime_s tell how fast the ringing dies away, so the torsion constant was taken without damping: it is too small.',
    });
  }
  if (reversal === null) return hasSwings(archive) ? [...warnings, noReversal] : warnings;
  const dwells = reversal.members.length;
  if (dwells < enoughDwells) {
    const consequence =
      reversal.known === null ? 'their scatter gives no uncertainty, so G has none' : 'their scatter gives a rough uncertainty only';
    warnings.push({ code: 'few-dwells', message: `Only ${dwells} dwells count: ${consequence}.` });
  }
  if (reversal.notAlternating) {
    warnings.push({
      code: 'not-alternating',
      message: 'The dwells that count do not alternate between near and far, so a polynomial drift was removed instead of ABA windows.',
    });
  }
  const { rig } = archive;
  const near = rig.stations.near;
  if (solution !== null && near !== undefined && torquePerG(geometryOf(rig), near.value * RAD_PER_DEG) < 0) {
    warnings.push({
      code: 'near-not-positive',
      message: 'The torque at stations.near is negative; near should be the station with positive torque.',
    });
  }
  if (solution !== null && solution.bigG < 0) {
    warnings.push({
      code: 'sign',
      message: 'Near minus far has the wrong sign, so G came out negative: look at lever.sense and at the stations.',
    });
  }
  return warnings;
}
