import { studentTProbability } from './student-t';

/** Whether a difference is shown to lie within ± a bound: a test that is merely not significant shows nothing. */
export interface Equivalence {
  /** The greater of the two one-sided probabilities. */
  p: number;
  /** p below 5 %, that is: the two-sided 90 % interval lies within the bound. */
  equivalent: boolean;
}

const level = 0.05;

/** Two one-sided t tests (Schuirmann 1987, from memory) of a value with standard uncertainty u and ν degrees of freedom. */
export function equivalence({ value, u, nu }: { value: number; u: number; nu: number }, bound: number): Equivalence {
  const below = 1 - studentTProbability((value + bound) / u, nu);
  const above = studentTProbability((value - bound) / u, nu);
  const p = Math.max(below, above);
  return { p, equivalent: p < level };
}
