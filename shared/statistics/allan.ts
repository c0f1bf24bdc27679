/** Overlapping Allan deviation (NIST SP 1065, 5.2.4) of a series of averages, one each `tauS` seconds, at 1, 2, 4, … of them. */
export interface AllanPoint {
  tau_s: number;
  deviation: number;
}

/** Octaves of averaging for which at least two second differences are left. */
export function allanDeviations(values: readonly number[], tauS: number): AllanPoint[] {
  const points: AllanPoint[] = [];
  for (let m = 1; values.length + 1 - 2 * m >= 2; m *= 2) points.push({ tau_s: m * tauS, deviation: allanDeviation(values, m) });
  return points;
}

/** Of averages over m neighbours, in the unit of the values. */
export function allanDeviation(values: readonly number[], m: number): number {
  const { sum, count } = allanSums(values, m);
  return Math.sqrt(sum / (2 * m * m * count));
}

/** Squares of the second differences of the summed values over m neighbours, and how many there are. */
export function allanSums(values: readonly number[], m: number): { sum: number; count: number } {
  const phase = new Float64Array(values.length + 1);
  values.forEach((value, i) => (phase[i + 1] = (phase[i] as number) + value));
  const count = Math.max(0, phase.length - 2 * m);
  let sum = 0;
  for (let i = 0; i < count; i += 1) {
    sum += ((phase[i + 2 * m] as number) - 2 * (phase[i + m] as number) + (phase[i] as number)) ** 2;
  }
  return { sum, count };
}
