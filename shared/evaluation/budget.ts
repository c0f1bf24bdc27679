import { effectiveDegreesOfFreedom } from '../statistics/weighted-mean';
import type { RigDocument } from '../rig/document';
import { budgetInputs, derivativeStep } from './budget-inputs';
import type { Known } from './free-oscillator';
import type { BudgetLine } from './result';

/** G as a function of everything it is computed from; each key left out stays as it was observed. */
export type GOf = (changes: { rig?: RigDocument; reversalRad?: number; periodS?: number; decayTimeS?: number }) => number;

export interface BudgetQuestion {
  rig: RigDocument;
  bigG: number;
  gOf: GOf;
  stations: readonly string[];
  lever: boolean;
  reversal: Known;
  period: Known;
  decayTime: Known | null;
  /** Relative change of G by the offset between turntable axis and fibre; null where the rig states none. */
  axisOffset: { value: number; u: number; relative: number } | null;
}

export interface Budget {
  lines: BudgetLine[];
  /** Standard uncertainty of G. */
  u: number;
  /** Infinity where only values without stated degrees of freedom count. */
  degreesOfFreedom: number;
}

interface Term {
  line: Omit<BudgetLine, 'share'>;
  /** Sensitivity times u, with its sign. */
  signed: number;
  nu: number;
  group: string | null;
}

/**
 * The linear budget (JCGM 100:2008, 5): each sensitivity is the derivative of the whole solution, κ and the ring-down's
 * correction included. Inputs of one group share their error fully, so their contributions add with their signs.
 */
export function budgetOf(question: BudgetQuestion): Budget {
  const terms = [...rigTerms(question), ...observedTerms(question), ...axisTerm(question)];
  const all = Math.hypot(...terms.map(({ line }) => line.contribution));
  const joined = joinGroups(terms);
  const u = Math.hypot(...joined.map(({ contribution }) => contribution));
  const lines = terms
    .map(({ line }) => ({ ...line, share: all === 0 ? 0 : (line.contribution / all) ** 2 }))
    .sort((a, b) => b.contribution - a.contribution);
  return { lines, u, degreesOfFreedom: effectiveDegreesOfFreedom(joined) };
}

function term(input: string, known: Known & { group?: string | undefined }, sensitivity: number): Term {
  const signed = sensitivity * known.u;
  return {
    line: { input, value: known.value, u: known.u, sensitivity, contribution: Math.abs(signed) },
    signed,
    nu: known.nu,
    group: known.group ?? null,
  };
}

function rigTerms({ rig, gOf, stations, lever }: BudgetQuestion): Term[] {
  return budgetInputs(rig, { stations, lever }).map(({ path, quantity, shifted }) => {
    const sensitivity = derivative((step) => gOf({ rig: shifted(step) }), derivativeStep(quantity));
    return term(path, { value: quantity.value, u: quantity.u, nu: quantity.nu ?? Infinity, group: quantity.group }, sensitivity);
  });
}

function observedTerms({ gOf, reversal, period, decayTime }: BudgetQuestion): Term[] {
  const relativeStep = 1e-4;
  const byReversal = derivative((step) => gOf({ reversalRad: reversal.value + step }), relativeStep * Math.abs(reversal.value));
  const decayTimeS = decayTime?.value ?? Infinity;
  const byPeriod = derivative((step) => gOf({ periodS: period.value + step, decayTimeS }), relativeStep * period.value);
  const terms = [term('reversal_rad', reversal, byReversal), term('period_s', period, byPeriod)];
  if (decayTime === null) return terms;
  const byDecay = derivative((step) => gOf({ periodS: period.value, decayTimeS: decayTime.value + step }), relativeStep * decayTime.value);
  return [...terms, term('decayTime_s', decayTime, byDecay)];
}

/** Where the offset's direction is not known its whole size counts as uncertainty, and what it does to G goes with its square. */
function axisTerm({ bigG, axisOffset }: BudgetQuestion): Term[] {
  if (axisOffset === null) return [];
  const u = Math.hypot(axisOffset.value, axisOffset.u);
  const sensitivity = u === 0 ? 0 : (axisOffset.relative * Math.abs(bigG)) / u;
  return [term('axis.offset', { value: axisOffset.value, u, nu: Infinity }, sensitivity)];
}

/** Central difference with one step of Richardson's extrapolation. */
function derivative(f: (step: number) => number, step: number): number {
  const coarse = (f(step) - f(-step)) / (2 * step);
  const fine = (f(step / 2) - f(-step / 2)) / step;
  return (4 * fine - coarse) / 3;
}

function joinGroups(terms: readonly Term[]): { contribution: number; nu: number }[] {
  const alone = terms.filter(({ group }) => group === null).map(({ signed, nu }) => ({ contribution: signed, nu }));
  const groups = new Map<string, { contribution: number; nu: number }>();
  for (const { group, signed, nu } of terms) {
    if (group === null) continue;
    const before = groups.get(group) ?? { contribution: 0, nu: Infinity };
    groups.set(group, { contribution: before.contribution + signed, nu: Math.min(before.nu, nu) });
  }
  return [...alone, ...groups.values()];
}
