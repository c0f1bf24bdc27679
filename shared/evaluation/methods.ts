import type { Archive } from '../archive/read-archive';
import { UnusableArchive } from '../archive/unusable-archive';
import { CODATA_2022_G } from '../physics/constants';
import type { RigDocument } from '../rig/document';
import { SingularMatrixError } from '../statistics/symmetric';
import type { Analysis } from './analysis';
import { basisOf } from './basis-of';
import type { Budget } from './budget';
import type { GBasis } from './g-basis';
import { budgetFor, modulationBudget, periodBudget, trialModelOf } from './g-budget';
import { modulationOutcome } from './modulation-method';
import type { TrialModel } from './monte-carlo';
import { periodOutcome } from './period-method';
import { evaluationMethods, type EvaluationPlan } from './registration';
import type { EvaluationResult, MethodResult } from './result';
import { NoSolutionError } from './solve-g';

/** What one method makes of a run. */
export interface Found extends Pick<Analysis, 'solution' | 'free' | 'clockOffset'> {
  budget: Budget | null;
  trialModel: TrialModel | null;
  /** Null where G does not follow from equilibria. */
  basis: GBasis | null;
  modulation?: EvaluationResult['modulation'];
}

type Question = Pick<EvaluationPlan, 'method' | 'channel'>;

/** `analysis`: of whole dwells, or of their beginnings for the acceleration. @throws UnusableArchive where the method needs what the run has not. */
export function foundBy(archive: Archive, { method, channel }: Question, analysis: Analysis): Found {
  if (method === 'period') return byPeriod(archive.rig, analysis);
  if (method === 'modulation') return byModulation(archive, channel, analysis);
  return byEquilibria(archive.rig, analysis);
}

function byEquilibria(rig: RigDocument, analysis: Analysis): Found {
  const basis = basisOf(analysis);
  const budget = basis === null ? null : budgetFor(rig, basis);
  return { ...analysis, budget, trialModel: trialModelOf(rig, budget, analysis), basis };
}

function byPeriod(rig: RigDocument, analysis: Analysis): Found {
  const outcome = periodOutcome(rig, analysis);
  const { solution, period } = outcome;
  const budget = periodBudget(rig, outcome, analysis.segments);
  const omega0Squared = { ...analysis.free.omega0Squared, value: solution.omega0Squared };
  return {
    solution,
    clockOffset: analysis.clockOffset,
    free: { ...analysis.free, period, omega0Squared },
    budget,
    trialModel: trialModelOf(rig, budget, { solution }),
    basis: null,
  };
}

function byModulation(archive: Archive, channel: string, analysis: Analysis): Found {
  const outcome = modulationOutcome(archive, channel, analysis);
  const { solution, clockOffset, turns, amplitudeRad } = outcome;
  const budget = modulationBudget(archive.rig, outcome, analysis);
  const u = budget?.terms.find(({ line }) => line.input === 'modulation_rad')?.line.u ?? null;
  return {
    solution,
    free: analysis.free,
    clockOffset,
    budget,
    trialModel: trialModelOf(archive.rig, budget, { solution }),
    basis: null,
    modulation: { turns, amplitude_rad: { value: amplitudeRad, u } },
  };
}

/** G as a result tells it. */
export function answerOf({ bigG, budget }: { bigG: number; budget: Budget | null }) {
  const u = budget?.u ?? null;
  const degreesOfFreedom = budget === null || !Number.isFinite(budget.degreesOfFreedom) ? null : budget.degreesOfFreedom;
  return {
    G: { value: bigG, u, degreesOfFreedom },
    relativeU: u === null || bigG === 0 ? null : u / Math.abs(bigG),
    En: u === null ? null : (bigG - CODATA_2022_G.value) / (2 * Math.hypot(u, CODATA_2022_G.u)),
  };
}

/** The methods side by side, that of the result among them: each with its G, and why one gives none. `whole`: the analysis of whole dwells. */
export function methodsBeside(
  archive: Archive,
  plan: Question,
  result: { whole: Analysis; bigG: number; budget: Budget | null },
): MethodResult[] {
  const rotates = archive.steps.some(({ kind }) => kind === 'rotate');
  const compared = evaluationMethods.filter((method) => method !== 'modulation' || rotates);
  return compared.map((method): MethodResult => {
    const found = method === plan.method ? result : foundOrWhy(archive, { ...plan, method }, result.whole);
    if (typeof found === 'string') return { method, G: null, relativeU: null, En: null, difference: null, why: found };
    const difference = method === plan.method ? null : { value: found.bigG - result.bigG, u: differenceU(found.budget, result.budget) };
    return { method, ...answerOf(found), difference, why: null };
  });
}

/** What a method found, or why it found nothing. */
function foundOrWhy(archive: Archive, question: Question, whole: Analysis): { bigG: number; budget: Budget | null } | string {
  try {
    const { solution, budget } = foundBy(archive, question, question.method === 'acceleration' ? whole.byBeginnings() : whole);
    return solution === null
      ? 'without a near and a far dwell next to one another there is no difference'
      : { bigG: solution.bigG, budget };
  } catch (error) {
    if (error instanceof UnusableArchive) return error.why;
    if (error instanceof NoSolutionError || error instanceof SingularMatrixError) return error.message;
    throw error;
  }
}

const observed = new Set(['reversal_rad', 'modulation_rad', 'period_s', 'decayTime_s']);

/**
 * u of the difference of two methods' G. They share the rig, so an error of a length or a mass moves both and only what it moves them apart by
 * counts; what was observed counts as independent, though the samples are the same. Null where one has no budget.
 */
function differenceU(one: Budget | null, other: Budget | null): number | null {
  if (one === null || other === null) return null;
  const apart = new Map<string, number>();
  const add = ({ terms }: Budget, sign: 1 | -1) => {
    for (const { line, signed, group } of terms) {
      const key = observed.has(line.input) ? `${line.input} ${String(sign)}` : (group ?? line.input);
      apart.set(key, (apart.get(key) ?? 0) + sign * signed);
    }
  };
  add(one, 1);
  add(other, -1);
  return Math.hypot(0, ...apart.values());
}
