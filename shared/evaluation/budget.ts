import { effectiveDegreesOfFreedom } from '../statistics/weighted-mean';
import type { Quantity, RigDocument } from '../rig/document';
import { budgetInputs, derivativeStep } from './budget-inputs';
import type { Known } from './free-oscillator';
import type { BudgetLine } from './result';

export interface BudgetQuestion {
  rig: RigDocument;
  bigG: number;
  /** G of the same observations for a rig supposed otherwise. */
  gOf: (rig: RigDocument) => number;
  stations: readonly string[];
  lever: boolean;
  /** What was observed, with ∂G/∂input. */
  observed: readonly ObservedTerm[];
  /** Relative change of G by the offset between turntable axis and fibre; null where the rig states none. */
  axisOffset: { value: number; u: number; relative: number } | null;
  /** Observed inputs that err together; absent: none do. */
  correlations?: readonly Correlation[];
}

export interface Correlation {
  of: readonly [ObservedTerm['input'], ObservedTerm['input']];
  r: number;
}

export interface ObservedTerm {
  input: 'reversal_rad' | 'modulation_rad' | 'period_s' | 'decayTime_s' | 'calibration.slope';
  known: Known;
  sensitivity: number;
}

export interface Budget {
  lines: BudgetLine[];
  /** Standard uncertainty of G. */
  u: number;
  /** Infinity where only values without stated degrees of freedom count. */
  degreesOfFreedom: number;
  terms: BudgetTerm[];
  correlations: readonly Correlation[];
}

/** One input of the budget with what the published line leaves out. */
export interface BudgetTerm {
  line: Omit<BudgetLine, 'share'>;
  /** Sensitivity times u, with its sign. */
  signed: number;
  /** ∂G/∂input itself, also where the line shows what the second order makes of it. */
  slope: number;
  nu: number;
  group: string | null;
  rectangular: boolean;
}

/**
 * The budget (JCGM 100:2008, 5): each sensitivity is the derivative of the whole solution, κ and the ring-down's correction
 * included. Where the derivative vanishes, as at the greatest torque, what the second order does is put in its place. Inputs of one
 * group share their error fully, so their contributions add with their signs. What was observed together errs together (5.2): lines of
 * their own hold what that adds to the square of u, or takes from it.
 */
export function budgetOf(question: BudgetQuestion): Budget {
  const observed = question.observed.map(({ input, known, sensitivity }) => term(input, known, { slope: sensitivity }));
  const terms = [...rigTerms(question), ...observed, ...axisTerm(question)];
  const together = (question.correlations ?? []).map((one) => ({ ...one, square: squareTogether(terms, one) }));
  const added = together.reduce((sum, { square }) => sum + square, 0);
  const all = terms.reduce((sum, { line }) => sum + line.contribution ** 2, 0) + added;
  const joined = joinGroups(terms);
  const u = Math.sqrt(Math.max(0, joined.reduce((sum, { contribution }) => sum + contribution ** 2, 0) + added));
  const shareOf = (square: number) => (all > 0 ? square / all : 0);
  const lines = [
    ...terms.map(({ line }) => ({ ...line, share: shareOf(line.contribution ** 2) })),
    ...together
      .filter(({ square }) => square !== 0)
      .map(({ of: [a, b], r, square }) => ({
        input: `correlation.${a}.${b}`,
        value: r,
        u: 0,
        sensitivity: 0,
        contribution: Math.sqrt(Math.abs(square)),
        share: shareOf(square),
      })),
  ].sort((a, b) => b.contribution - a.contribution);
  return { lines, u, degreesOfFreedom: effectiveDegreesOfFreedom(joined), terms, correlations: question.correlations ?? [] };
}

/** 2 cᵢ cⱼ uᵢ uⱼ r (JCGM 100:2008, 5.2.2). */
function squareTogether(terms: readonly BudgetTerm[], { of, r }: Correlation): number {
  const [a, b] = of.map((input) => terms.find(({ line }) => line.input === input)?.signed ?? 0) as [number, number];
  return 2 * r * a * b;
}

type Stated = Known & Pick<Quantity, 'group' | 'distribution'>;

/** `secondOrder` is the standard deviation of G that the curvature alone makes. */
function term(input: string, known: Stated, { slope, secondOrder = 0 }: { slope: number; secondOrder?: number }): BudgetTerm {
  const curved = secondOrder > Math.abs(slope) * known.u;
  const sensitivity = curved ? Math.hypot(slope, secondOrder / known.u) : slope;
  const signed = sensitivity * known.u;
  return {
    line: { input, value: known.value, u: known.u, sensitivity, contribution: Math.abs(signed) },
    signed,
    slope,
    nu: known.nu,
    // A square has no sign to share with others.
    group: curved ? null : (known.group ?? null),
    rectangular: known.distribution === 'rectangular',
  };
}

function rigTerms({ rig, bigG, gOf, stations, lever }: BudgetQuestion): BudgetTerm[] {
  return budgetInputs(rig, { stations, lever }).map(({ path, quantity, shifted }) => {
    const slope = derivative((step) => gOf(shifted(step)), derivativeStep(quantity));
    const known = { ...quantity, nu: quantity.nu ?? Infinity };
    return term(path, known, { slope, secondOrder: secondOrderOf(quantity, (step) => gOf(shifted(step)) - bigG) });
  });
}

/** ½ |G''| times the standard deviation of the square: √2 u² of a normal quantity, √0.8 u² of a rectangular one. */
function secondOrderOf({ u, distribution }: Quantity, change: (step: number) => number): number {
  if (u === 0) return 0;
  const bend = Math.abs(change(u) + change(-u)) / 2;
  return bend * Math.sqrt(distribution === 'rectangular' ? 0.8 : 2);
}

/** Where the offset's direction is not known its whole size counts as uncertainty, and what it does to G goes with its square. */
function axisTerm({ bigG, axisOffset }: BudgetQuestion): BudgetTerm[] {
  if (axisOffset === null) return [];
  const u = Math.hypot(axisOffset.value, axisOffset.u);
  const sensitivity = u === 0 ? 0 : (axisOffset.relative * Math.abs(bigG)) / u;
  return [term('axis.offset', { value: axisOffset.value, u, nu: Infinity }, { slope: sensitivity })];
}

/** Central difference with one step of Richardson's extrapolation. */
export function derivative(f: (step: number) => number, step: number): number {
  const coarse = (f(step) - f(-step)) / (2 * step);
  const fine = (f(step / 2) - f(-step / 2)) / step;
  return (4 * fine - coarse) / 3;
}

function joinGroups(terms: readonly BudgetTerm[]): { contribution: number; nu: number }[] {
  const alone = terms.filter(({ group }) => group === null).map(({ signed, nu }) => ({ contribution: signed, nu }));
  const groups = new Map<string, { contribution: number; nu: number }>();
  for (const { group, signed, nu } of terms) {
    if (group === null) continue;
    const before = groups.get(group) ?? { contribution: 0, nu: Infinity };
    groups.set(group, { contribution: before.contribution + signed, nu: Math.min(before.nu, nu) });
  }
  return [...alone, ...groups.values()];
}
