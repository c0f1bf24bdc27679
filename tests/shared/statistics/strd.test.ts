import { readFileSync } from 'node:fs';
import { fitSeparable, type BasisDerivative, type SeparableSegment } from '@/shared/statistics/variable-projection';
import { checkDataPath, relativeDifference } from '../../support/check-data';

/**
 * NIST Statistical Reference Datasets for nonlinear regression, certified to 11 digits. Each is linear in some of its
 * parameters; the rest are fitted by variable projection from both published starts.
 */

interface Dataset {
  starts: [number[], number[]];
  certified: number[];
  residualSum: number;
  x: Float64Array;
  y: Float64Array;
}

function readDataset(path: string): Dataset {
  const lines = readFileSync(path, 'utf8').split(/\r?\n/);
  const numbers = (line: string) => line.trim().split(/\s+/).map(Number);
  const parameters = lines.filter((line) => /^\s+b\d+\s*=/.test(line)).map((line) => numbers(line.split('=')[1] as string));
  const column = (k: number) => parameters.map((row) => row[k] as number);
  const dataStart = lines.findLastIndex((line) => /^Data:/.test(line)) + 1;
  const rows = lines
    .slice(dataStart)
    .filter((line) => line.trim() !== '')
    .map(numbers);
  const residualSum = Number(lines.find((line) => line.startsWith('Residual Sum of Squares'))?.split(':')[1]);
  return {
    starts: [column(0), column(1)],
    certified: column(2),
    residualSum,
    x: Float64Array.from(rows, (row) => row[1] as number),
    y: Float64Array.from(rows, (row) => row[0] as number),
  };
}

interface Model {
  name: string;
  /** Numbers (from 1) of the nonlinear parameters, and the parameter behind each linear coefficient. */
  nonlinear: number[];
  linear: (number | ((c: Float64Array) => number))[];
  digits: number;
  basis(x: Float64Array, alpha: readonly number[]): EagerBasis;
}

interface EagerBasis {
  columns: Float64Array[];
  derivatives: BasisDerivative[];
}
const one = (x: Float64Array) => x.map(() => 1);

const exponentials = (x: Float64Array, rates: readonly number[]): EagerBasis => ({
  columns: rates.map((rate) => x.map((v) => Math.exp(-rate * v))),
  derivatives: rates.map((rate, k) => ({ column: k, parameter: k, values: x.map((v) => -v * Math.exp(-rate * v)) })),
});

const shifted = (basis: EagerBasis, by: { column: number; parameter: number }): BasisDerivative[] =>
  basis.derivatives.map((d) => ({ ...d, column: d.column + by.column, parameter: d.parameter + by.parameter }));

function sines(x: Float64Array, periods: readonly number[]): EagerBasis {
  const w = periods.map((p) => (2 * Math.PI) / p);
  return {
    columns: w.flatMap((wk) => [x.map((v) => Math.cos(wk * v)), x.map((v) => Math.sin(wk * v))]),
    derivatives: w.flatMap((wk, k) => {
      const slope = -wk / (periods[k] as number);
      return [
        { column: 2 * k, parameter: k, values: x.map((v) => -v * slope * Math.sin(wk * v)) },
        { column: 2 * k + 1, parameter: k, values: x.map((v) => v * slope * Math.cos(wk * v)) },
      ];
    }),
  };
}

function gauss(x: Float64Array, [centre, width]: [number, number]): EagerBasis {
  const f = x.map((v) => Math.exp(-(((v - centre) / width) ** 2)));
  return {
    columns: [f],
    derivatives: [
      { column: 0, parameter: 0, values: x.map((v, i) => ((f[i] as number) * 2 * (v - centre)) / width ** 2) },
      { column: 0, parameter: 1, values: x.map((v, i) => ((f[i] as number) * 2 * (v - centre) ** 2) / width ** 3) },
    ],
  };
}

/** x^k over a polynomial whose coefficients are the parameters. */
function rational(
  x: Float64Array,
  powers: readonly number[],
  denominator: { value: (v: number) => number; slopes: ((v: number) => number)[] },
): EagerBasis {
  return {
    columns: powers.map((k) => x.map((v) => v ** k / denominator.value(v))),
    derivatives: powers.flatMap((k, column) =>
      denominator.slopes.map((slope, parameter) => ({
        column,
        parameter,
        values: x.map((v) => (-(v ** k) * slope(v)) / denominator.value(v) ** 2),
      })),
    ),
  };
}

const models: Model[] = [
  { name: 'Lanczos3', nonlinear: [2, 4, 6], linear: [1, 3, 5], digits: 4, basis: (x, rates) => exponentials(x, rates) },
  {
    name: 'MGH17',
    nonlinear: [4, 5],
    linear: [1, 2, 3],
    digits: 6,
    basis: (x, rates) => {
      const pair = exponentials(x, rates);
      return { columns: [one(x), ...pair.columns], derivatives: shifted(pair, { column: 1, parameter: 0 }) };
    },
  },
  {
    name: 'ENSO',
    nonlinear: [4, 7],
    linear: [1, 2, 3, 5, 6, 8, 9],
    digits: 6,
    basis: (x, periods) => {
      const year = sines(x, [12]);
      const two = sines(x, periods);
      return { columns: [one(x), ...year.columns, ...two.columns], derivatives: shifted(two, { column: 3, parameter: 0 }) };
    },
  },
  {
    name: 'Gauss1',
    nonlinear: [2, 4, 5, 7, 8],
    linear: [1, 3, 6],
    digits: 6,
    basis: (x, [rate, ...peaks]) => {
      const decay = exponentials(x, [rate as number]);
      const first = gauss(x, [peaks[0] as number, peaks[1] as number]);
      const second = gauss(x, [peaks[2] as number, peaks[3] as number]);
      return {
        columns: [...decay.columns, ...first.columns, ...second.columns],
        derivatives: [
          ...decay.derivatives,
          ...shifted(first, { column: 1, parameter: 1 }),
          ...shifted(second, { column: 2, parameter: 3 }),
        ],
      };
    },
  },
  {
    name: 'MGH09',
    nonlinear: [3, 4],
    linear: [1, (c) => (c[1] as number) / (c[0] as number)],
    digits: 6,
    basis: (x, [p, q]) => rational(x, [2, 1], { value: (v) => v * v + v * (p as number) + (q as number), slopes: [(v) => v, () => 1] }),
  },
  {
    name: 'Thurber',
    nonlinear: [5, 6, 7],
    linear: [1, 2, 3, 4],
    digits: 6,
    basis: (x, [p, q, r]) =>
      rational(x, [0, 1, 2, 3], {
        value: (v) => 1 + v * ((p as number) + v * ((q as number) + v * (r as number))),
        slopes: [(v) => v, (v) => v * v, (v) => v ** 3],
      }),
  },
  {
    name: 'Rat43',
    nonlinear: [2, 3, 4],
    linear: [1],
    digits: 6,
    basis: (x, [b, k, n]) => {
      const e = x.map((v) => Math.exp((b as number) - (k as number) * v));
      const f = e.map((ei) => (1 + ei) ** (-1 / (n as number)));
      const inner = e.map((ei, i) => -((f[i] as number) * ei) / ((n as number) * (1 + ei)));
      return {
        columns: [f.slice()],
        derivatives: [
          { column: 0, parameter: 0, values: inner },
          { column: 0, parameter: 1, values: x.map((v, i) => -v * (inner[i] as number)) },
          { column: 0, parameter: 2, values: e.map((ei, i) => ((f[i] as number) * Math.log1p(ei)) / (n as number) ** 2) },
        ],
      };
    },
  },
];

const lazily = ({ columns, derivatives }: EagerBasis) => ({ columns, derivatives: () => derivatives });

const cases = models.flatMap((model) => [0, 1].map((start) => ({ ...model, start })));

// ENSO's second start lies in the right valley; its first also, for a fit of the two periods alone.
test.each(cases)('$name comes out to $digits digits from start $start', (model) => {
  const path = checkDataPath(`strd/${model.name}.dat`);
  if (path === null) return;
  const data = readDataset(path);
  const segment: SeparableSegment = { y: data.y, basis: (alpha) => lazily(model.basis(data.x, alpha)) };
  const start = model.nonlinear.map((number) => (data.starts[model.start] as number[])[number - 1] as number);
  const fit = fitSeparable([segment], start, { maxIterations: 2000 });
  expect(relativeDifference(fit.ssr, data.residualSum)).toBeLessThan(1e-9);
  const tolerance = 10 ** -model.digits;
  model.nonlinear.forEach((number, k) =>
    expect(relativeDifference(fit.alpha[k] as number, data.certified[number - 1] as number)).toBeLessThan(tolerance),
  );
  const c = (fit.segments[0] as { coefficients: Float64Array }).coefficients;
  model.linear.forEach((from, k) => {
    const value = typeof from === 'number' ? (c[k] as number) : from(c);
    const certified = data.certified[(typeof from === 'number' ? from : k + 1) - 1] as number;
    expect(relativeDifference(value, certified)).toBeLessThan(tolerance);
  });
});
