interface Figure {
  name: string;
  value: number;
  unit: string;
  /** A limit, or another program's figure from the same run. */
  peer: number | null;
}

/** One measurement: whether a smaller (`at most`) or a greater (`at least`) value than the goal is wanted, or one between two; or it is only told. */
export type Measurement = Figure &
  ({ goal: number; want: 'at most' | 'at least' } | { goal: readonly [number, number]; want: 'within' } | { goal: null; want: 'told' });

const rounded = (value: number) => Number(value.toPrecision(5));

function meetsGoal(measurement: Measurement): boolean {
  const { value } = measurement;
  if (measurement.want === 'told') return true;
  if (measurement.want === 'within') return measurement.goal[0] <= value && value <= measurement.goal[1];
  return measurement.want === 'at most' ? value <= measurement.goal : value >= measurement.goal;
}

/** Prints a measurement as one JSON line on stdout. */
export function report(measurement: Measurement): void {
  const { name, value, unit, goal, peer } = measurement;
  const [roundedPeer, ratio] = peer === null ? [null, null] : [rounded(peer), rounded(value / peer)];
  process.stdout.write(
    `${JSON.stringify({ name, value: rounded(value), unit, goal, peer: roundedPeer, ratio, ok: meetsGoal(measurement) })}\n`,
  );
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
