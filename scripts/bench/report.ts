/** One measurement as one JSON line on stdout. `peer` is a limit or another program's figure from the same run. */
export interface Measurement {
  name: string;
  value: number;
  unit: string;
  goal: number;
  /** Whether a smaller (`at most`) or a greater (`at least`) value than the goal is wanted. */
  want: 'at most' | 'at least';
  peer: number | null;
}

const rounded = (value: number) => Number(value.toPrecision(5));

export function report({ name, value, unit, goal, want, peer }: Measurement): void {
  const ok = want === 'at most' ? value <= goal : value >= goal;
  const line = { name, value: rounded(value), unit, goal, peer: peer === null ? null : rounded(peer), ratio: peer === null ? null : rounded(value / peer), ok };
  process.stdout.write(`${JSON.stringify(line)}\n`);
}

/** Exponent b of cost = a · sizeᵇ by least squares on the logarithms. */
export function growth(points: readonly { size: number; cost: number }[]): number {
  const x = points.map(({ size }) => Math.log(size));
  const y = points.map(({ cost }) => Math.log(cost));
  const mean = (values: number[]) => values.reduce((sum, value) => sum + value, 0) / values.length;
  const [mx, my] = [mean(x), mean(y)];
  const over = x.reduce((sum, value, index) => sum + (value - mx) * ((y[index] as number) - my), 0);
  return over / x.reduce((sum, value) => sum + (value - mx) ** 2, 0);
}

/** The value below which the share `p` of the sorted values lies (nearest rank). */
export function quantile(values: readonly number[], p: number): number {
  const sorted = [...values].sort((a, b) => a - b);
  return sorted[Math.min(sorted.length - 1, Math.ceil(p * sorted.length) - 1)] as number;
}
