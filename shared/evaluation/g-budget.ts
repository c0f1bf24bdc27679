import { RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { leverOf } from '../physics/lever';
import { inertiaKgM2 } from '../physics/oscillator';
import type { RigDocument } from '../rig/document';
import type { Law } from '../statistics/draws';
import { cholesky, SingularMatrixError, type Matrix } from '../statistics/symmetric';
import type { Analysis } from './analysis';
import { axisOffsetOf } from './axis-offset';
import { budgetOf, derivative, type Budget, type BudgetTerm, type Correlation, type ObservedTerm } from './budget';
import { budgetInputs, derivativeStep } from './budget-inputs';
import { reread } from './channel-scale';
import type { Known } from './free-oscillator';
import { fromStored, type GBasis } from './g-basis';
import { gSystem } from './g-system';
import type { TrialInput, TrialModel } from './monte-carlo';
import type { ModulationOutcome } from './modulation-method';
import type { PeriodOutcome } from './period-method';
import { NoSolutionError, solveG } from './solve-g';
import type { TrialCore } from './trial-core';

/** What may be supposed otherwise than it was documented or observed; each key left out stays as it was. */
export interface Supposed {
  rig?: RigDocument;
  reversal?: Known;
  period?: Known;
  decayTime?: Known;
}

/** G of the same observations, with its budget: null without a scatter to judge the difference by. */
export interface SupposedG {
  bigG: number;
  budget: Budget | null;
}

/** The budget of G by the equilibria; null without a scatter to judge the difference by. */
export const budgetFor = (rig: RigDocument, basis: GBasis): Budget | null => supposedG(rig, basis, {}).budget;

/**
 * G and its budget by the equilibria, for the rig as documented or with something supposed otherwise.
 * @throws NoSolutionError where no G gives the observed difference.
 */
export function supposedG(documented: RigDocument, basis: GBasis, supposed: Supposed): SupposedG {
  const rig = supposed.rig ?? documented;
  const reversal = supposed.reversal ?? (basis.known.reversal === null ? null : fromStored(basis.known.reversal));
  const period = supposed.period ?? fromStored(basis.known.period);
  const decayTime = supposed.decayTime ?? (basis.known.decayTime === null ? null : fromStored(basis.known.decayTime));
  const isOther = supposed.period !== undefined || supposed.decayTime !== undefined;
  const gOf = gFunction(documented, basis, {
    rig,
    ...(supposed.reversal === undefined ? {} : { reversalRad: supposed.reversal.value }),
    ...(isOther ? { periodS: period.value, decayTimeS: decayTime?.value ?? Infinity } : {}),
  });
  const bigG = gOf({});
  if (reversal === null) return { bigG, budget: null };
  const stations = [...new Set(basis.reversal.members.map(({ segment }) => basis.segments[segment]?.window.stationKey ?? null))];
  const budget = budgetOf({
    rig,
    bigG,
    gOf: (other) => gOf({ rig: other }),
    stations: stations.filter((key) => key !== null),
    lever: basis.scale.kind === 'spot',
    observed: [...observedTerms(gOf, { reversal, period, decayTime }), ...calibrationTerm(basis.calibration, gOf)],
    axisOffset: axisOffsetOf(rig),
    correlations: correlationsOf(basis),
  });
  return { bigG, budget };
}

function correlationsOf({ together }: GBasis): Correlation[] {
  if (together === undefined) return [];
  return possible([
    { of: ['reversal_rad', 'period_s'], r: together.reversalPeriod },
    { of: ['reversal_rad', 'decayTime_s'], r: together.reversalDecayTime },
    { of: ['period_s', 'decayTime_s'], r: together.periodDecayTime },
  ]);
}

/** Coefficients from few dwells may contradict each other: then all are taken smaller alike until they no longer do. */
function possible(correlations: Correlation[]): Correlation[] {
  try {
    cholesky(matrixOf(correlations));
    return correlations;
  } catch (error) {
    if (!(error instanceof SingularMatrixError)) throw error;
    return possible(correlations.map(({ of, r }) => ({ of, r: 0.95 * r })));
  }
}

/** The observed inputs that err together, as their rows stand in the matrix of their correlations. */
const observedOrder = ['reversal_rad', 'period_s', 'decayTime_s'] as const;

const matrixOf = (correlations: readonly Correlation[]): Matrix =>
  observedOrder.map((a) =>
    observedOrder.map((b) => (a === b ? 1 : (correlations.find(({ of }) => of.includes(a) && of.includes(b))?.r ?? 0))),
  );

/** The budget of G by the time of swing: what the frequencies leave open stands in the line of the period. */
export function periodBudget(rig: RigDocument, outcome: PeriodOutcome, segments: Analysis['segments']): Budget {
  const stations = [...new Set(segments.map(({ window }) => window.stationKey))].filter((key) => key !== null);
  const { solution, statistical, period, gOf } = outcome;
  const sensitivity = period.u === 0 ? 0 : statistical.u / period.u;
  const observed: ObservedTerm[] = [{ input: 'period_s', known: { ...period, nu: statistical.nu }, sensitivity }];
  return budgetOf({ rig, bigG: solution.bigG, gOf, stations, lever: false, observed, axisOffset: null });
}

/** The budget of G by modulation: what the turns leave open stands in the line of the amplitude. Null with fewer than two turns. */
export function modulationBudget(rig: RigDocument, outcome: ModulationOutcome, { free, scale, calibration }: Analysis): Budget | null {
  const { solution, statistical, amplitudeRad, gOf } = outcome;
  if (statistical === null) return null;
  const { period, decayTime } = free;
  const decayTimeS = decayTime === null ? {} : { decayTimeS: decayTime.value };
  const byAmplitude = solution.bigG / amplitudeRad;
  const observed: ObservedTerm[] = [
    {
      input: 'modulation_rad',
      known: { value: amplitudeRad, u: statistical.u / Math.abs(byAmplitude), nu: statistical.nu },
      sensitivity: byAmplitude,
    },
    {
      input: 'period_s',
      known: period,
      sensitivity: derivative((step) => gOf({ periodS: period.value + step, ...decayTimeS }), relativeStep * period.value),
    },
  ];
  if (decayTime !== null)
    observed.push({
      input: 'decayTime_s',
      known: decayTime,
      sensitivity: derivative((step) => gOf({ periodS: period.value, decayTimeS: decayTime.value + step }), relativeStep * decayTime.value),
    });
  if (calibration !== null)
    observed.push({
      input: 'calibration.slope',
      known: { value: calibration.slope, u: calibration.uSlope, nu: Infinity },
      sensitivity: solution.bigG / calibration.slope,
    });
  const lever = scale.kind === 'spot';
  return budgetOf({ rig, bigG: solution.bigG, gOf: (supposed) => gOf({ rig: supposed }), stations: [], lever, observed, axisOffset: null });
}

const relativeStep = 1e-4;

function observedTerms(gOf: GOf, known: { reversal: Known; period: Known; decayTime: Known | null }): ObservedTerm[] {
  const { reversal, period, decayTime } = known;
  const byReversal = derivative(
    (step) => gOf({ reversalRad: reversal.value + step }),
    relativeStep * Math.abs(reversal.value) || relativeStep,
  );
  const decayTimeS = decayTime?.value ?? Infinity;
  const byPeriod = derivative((step) => gOf({ periodS: period.value + step, decayTimeS }), relativeStep * period.value);
  const terms: ObservedTerm[] = [
    { input: 'reversal_rad', known: reversal, sensitivity: byReversal },
    { input: 'period_s', known: period, sensitivity: byPeriod },
  ];
  if (decayTime === null) return terms;
  const byDecay = derivative((step) => gOf({ periodS: period.value, decayTimeS: decayTime.value + step }), relativeStep * decayTime.value);
  return [...terms, { input: 'decayTime_s', known: decayTime, sensitivity: byDecay }];
}

/** The slope of the channel's calibration stretches every difference alike; its offset drops out of near minus far. */
function calibrationTerm(calibration: GBasis['calibration'], gOf: GOf): ObservedTerm[] {
  if (calibration === undefined) return [];
  const { slope, uSlope } = calibration;
  const sensitivity = derivative((step) => gOf({ stretch: 1 + step / slope }), relativeStep * Math.abs(slope));
  return [{ input: 'calibration.slope', known: { value: slope, u: uSlope, nu: Infinity }, sensitivity }];
}

/** What G is computed from; each key left out stays as it is supposed anyway. */
interface Changes {
  rig?: RigDocument;
  reversalRad?: number;
  periodS?: number;
  decayTimeS?: number;
  /** By how much more every reading changes than was read. */
  stretch?: number;
}
type GOf = (changes: Changes) => number;

/** G of the same observations for a rig, a difference or a pendulum other than those supposed anyway. */
function gFunction(documented: RigDocument, { scale, segments, found, measured, free, reversal, bigG }: GBasis, anyway: Changes): GOf {
  return (changes) => {
    const { rig = documented, reversalRad, periodS, decayTimeS, stretch = 1 } = { ...anyway, ...changes };
    const given = leverOf(rig);
    // A spot that moves more is one that is nearer.
    const lever = given === null ? null : { ...given, distanceM: given.distanceM / stretch };
    const rereadRad = () =>
      reversal.members.reduce((sum, { segment, weight }) => sum + weight * reread(scale, segments[segment]?.centreRad ?? 0, lever), 0);
    const readRad = () => (scale.kind === 'angle' ? stretch * reversal.value : rereadRad());
    const system = gSystem({
      rig,
      stationsOf: documented,
      segments,
      found,
      measured,
      free,
      reversal,
      reversalRad: reversalRad === undefined ? readRad() : stretch * reversalRad,
      ...(periodS === undefined || decayTimeS === undefined ? {} : { oscillator: { periodS, decayTimeS } }),
    });
    if (system === null) throw new NoSolutionError('there is no source on the turntable');
    return solveG(system, bigG).bigG;
  };
}

/** u of κ = I ω₀², N m/rad: from the frequency and from everything that the inertia is made of. */
export function kappaU(rig: RigDocument, omega0Squared: Known): number {
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

/** What the Monte Carlo trials need; null without a budget. */
export function trialModelOf(
  rig: RigDocument,
  budget: Budget | null,
  analysis: Pick<Analysis, 'solution'> & Partial<Analysis>,
): TrialModel | null {
  const { solution } = analysis;
  if (budget === null || solution === null || solution.bigG === 0) return null;
  return {
    bigG: solution.bigG,
    inputs: budget.terms.map((one) => ({
      input: one.line.input,
      value: one.line.value,
      u: one.line.u,
      law: lawOf(one),
      group: one.group,
      logSlope: one.slope / solution.bigG,
      ...mixOf(one.line.input, budget.correlations),
    })),
    core: coreOf(rig, analysis),
  };
}

/** Of what independent deviates that of an input is made, where it errs together with inputs drawn before it. */
function mixOf(input: string, correlations: readonly Correlation[]): Pick<TrialInput, 'mix'> {
  const row = observedOrder.findIndex((name) => name === input);
  if (row < 1 || correlations.length === 0) return {};
  const factors = cholesky(matrixOf(correlations))[row] as number[];
  return { mix: observedOrder.slice(0, row + 1).map((name, k) => ({ input: name, factor: factors[k] as number })) };
}

function lawOf({ nu, rectangular }: BudgetTerm): Law {
  if (rectangular) return { kind: 'rectangular' };
  return Number.isFinite(nu) ? { kind: 't', nu } : { kind: 'normal' };
}

function coreOf(rig: RigDocument, { reversal, solution, free, system }: Partial<Analysis>): TrialCore | null {
  const { near, far } = rig.stations;
  if (!reversal || !solution || !system || !free || near === undefined || far === undefined) return null;
  const { geometry } = system;
  const restAt = (angleDeg: number) =>
    equilibriumRad({ geometry, kappa: solution.kappa, bigG: solution.bigG, phiRad: angleDeg * RAD_PER_DEG });
  return {
    geometry: { ...geometry, pairs: geometry.pairs.map(({ cylinder: _, ...pair }) => pair) },
    ballRadiusM: rig.pendulum.ballRadius.value,
    extraInertia: rig.pendulum.extraInertia?.value ?? 0,
    nearDeg: near.value,
    farDeg: far.value,
    nearRad: restAt(near.value),
    farRad: restAt(far.value),
    reversalRad: reversal.value,
    periodS: free.period.value,
    decayTimeS: free.decayTime?.value ?? Infinity,
  };
}
