import { fitNonlinear, type Model } from '@/shared/statistics/nonlinear-fit';
import { normalDeviates } from '../../support/lcg';

/**
 * The general fit on models of the kinds that outsiders try it with: small certified sets (NIST StRD, data and certified values from memory; each
 * set is whole, because its certified residual sum of squares comes out to ten digits), and data made from the certified parameters of the
 * greater ones, on which the fit from the truth is the certificate.
 */

const { exp, PI, atan } = Math;
type B = readonly number[];
const b = (values: B, k: number) => values[k - 1] as number;
const spread = (from: number, to: number, count: number) => Array.from({ length: count }, (_, k) => from + ((to - from) * k) / (count - 1));
const digitsOf = (found: number, certified: number) => -Math.log10(Math.abs(found / certified - 1) + 1e-16);

interface Certified {
  name: string;
  model: Model<number>;
  x: number[];
  y: number[];
  starts: [number[], number[]];
  sum: number;
  parameters?: number[];
}

const misra = {
  x: [77.6, 114.9, 141.1, 190.8, 239.9, 289.0, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760.0],
  y: [10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.4, 75.47, 81.78],
};
const lanczos: Model<number> = (x, v) => b(v, 1) * exp(-b(v, 2) * x) + b(v, 3) * exp(-b(v, 4) * x) + b(v, 5) * exp(-b(v, 6) * x);
const lanczosAt = spread(0, 1.15, 24);
const lanczosStarts: Certified['starts'] = [
  [1.2, 0.3, 5.6, 5.5, 6.5, 7.6],
  [0.5, 0.7, 3.6, 4.2, 4, 6.3],
];

const certified: Certified[] = [
  {
    name: 'Misra1a',
    ...misra,
    model: (x, v) => b(v, 1) * (1 - exp(-b(v, 2) * x)),
    starts: [
      [500, 1e-4],
      [250, 5e-4],
    ],
    sum: 0.12455138894,
    parameters: [238.94212918, 5.5015643181e-4],
  },
  {
    name: 'Misra1b',
    ...misra,
    model: (x, v) => b(v, 1) * (1 - (1 + (b(v, 2) * x) / 2) ** -2),
    starts: [
      [500, 1e-4],
      [300, 2e-4],
    ],
    sum: 0.075464681533,
  },
  {
    name: 'Misra1c',
    ...misra,
    model: (x, v) => b(v, 1) * (1 - (1 + 2 * b(v, 2) * x) ** -0.5),
    starts: [
      [500, 1e-4],
      [600, 2e-4],
    ],
    sum: 0.040966836971,
  },
  {
    name: 'Misra1d',
    ...misra,
    model: (x, v) => (b(v, 1) * b(v, 2) * x) / (1 + b(v, 2) * x),
    starts: [
      [500, 1e-4],
      [450, 3e-4],
    ],
    sum: 0.056419295283,
  },
  {
    name: 'DanWood',
    x: [1.309, 1.471, 1.49, 1.565, 1.611, 1.68],
    y: [2.138, 3.421, 3.597, 4.34, 4.882, 5.66],
    model: (x, v) => b(v, 1) * x ** b(v, 2),
    starts: [
      [1, 5],
      [0.7, 4],
    ],
    sum: 0.0043173084083,
    parameters: [0.76886226176, 3.8604055871],
  },
  {
    name: 'Rat42',
    x: [9, 14, 21, 28, 42, 57, 63, 70, 79],
    y: [8.93, 10.8, 18.59, 22.33, 39.35, 56.11, 61.73, 64.62, 67.08],
    model: (x, v) => b(v, 1) / (1 + exp(b(v, 2) - b(v, 3) * x)),
    starts: [
      [100, 1, 0.1],
      [75, 2.5, 0.07],
    ],
    sum: 8.0565229338,
  },
  {
    name: 'MGH10, whose first start is off by a factor of seventy',
    x: spread(50, 125, 16),
    y: [34780, 28610, 23650, 19630, 16370, 13720, 11540, 9744, 8261, 7030, 6005, 5147, 4427, 3820, 3307, 2872],
    model: (x, v) => b(v, 1) * exp(b(v, 2) / (x + b(v, 3))),
    starts: [
      [2, 400000, 25000],
      [0.02, 4000, 250],
    ],
    sum: 87.945855171,
    parameters: [5.609636471e-3, 6.1813463463e3, 3.4522363462e2],
  },
  {
    name: 'Eckerle4',
    x: [
      400, 405, 410, 415, 420, 425, 430, 435, 436.5, 438, 439.5, 441, 442.5, 444, 445.5, 447, 448.5, 450, 451.5, 453, 454.5, 456, 457.5,
      459, 460.5, 462, 463.5, 465, 470, 475, 480, 485, 490, 495, 500,
    ],
    y: [
      0.0001575, 0.0001699, 0.000235, 0.0003102, 0.0004917, 0.000871, 0.0017418, 0.00464, 0.0065895, 0.0097302, 0.0149002, 0.023731,
      0.0401683, 0.0712559, 0.1264458, 0.2073413, 0.2902366, 0.3445623, 0.3698049, 0.3668534, 0.3106727, 0.2078154, 0.1164354, 0.0616764,
      0.03372, 0.0194023, 0.0117831, 0.0074357, 0.0022732, 0.00088, 0.0004579, 0.0002345, 0.0001586, 0.0001143, 0.000071,
    ],
    model: (x, v) => (b(v, 1) / b(v, 2)) * exp(-0.5 * ((x - b(v, 3)) / b(v, 2)) ** 2),
    starts: [
      [1, 10, 500],
      [1.5, 5, 450],
    ],
    sum: 0.0014635887487,
    parameters: [1.5543827178, 4.0888321754, 451.54121844],
  },
  {
    name: 'Roszman1',
    x: [
      -4868.68, -4868.09, -4867.41, -3375.19, -3373.14, -3372.03, -2473.74, -2472.35, -2469.45, -1894.65, -1893.4, -1497.24, -1495.85,
      -1493.41, -1208.68, -1206.18, -1206.04, -997.92, -996.61, -996.31, -834.94, -834.66, -710.03, -530.16, -464.17,
    ],
    y: [
      0.252429, 0.252141, 0.251809, 0.297989, 0.296257, 0.295319, 0.339603, 0.337731, 0.33382, 0.38951, 0.386998, 0.438864, 0.434887,
      0.427893, 0.471568, 0.461699, 0.461144, 0.513532, 0.506641, 0.505062, 0.535648, 0.533726, 0.568064, 0.612886, 0.624169,
    ],
    model: (x, v) => b(v, 1) - b(v, 2) * x - atan(b(v, 3) / (x - b(v, 4))) / PI,
    starts: [
      [0.1, -1e-5, 1000, -100],
      [0.2, -5e-6, 1200, -150],
    ],
    sum: 4.9484847331e-4,
    parameters: [0.20196866396, -6.1953516256e-6, 1204.4556708, -181.34269537],
  },
  {
    name: 'Lanczos2, three exponentials of data of six digits',
    x: lanczosAt,
    y: lanczosAt.map((x) => Number(lanczos(x, [0.0951, 1, 0.8607, 3, 1.5576, 5]).toExponential(5))),
    model: lanczos,
    starts: lanczosStarts,
    sum: 2.2299428125e-11,
  },
];

test.each(certified.flatMap((set) => [0, 1].map((which) => ({ ...set, which }))))(
  '$name, start $which, has the certified sum of squares and parameters',
  ({ model, x, y, starts, sum, parameters, which }) => {
    const found = fitNonlinear(model, { x, y }, starts[which] as number[]);
    expect(digitsOf(found.residualSumOfSquares, sum)).toBeGreaterThan(9.5);
    (parameters ?? []).forEach((value, k) => expect(digitsOf(found.parameters[k] as number, value)).toBeGreaterThan(9));
    expect(found.standardDeviations.every((u) => u > 0 && Number.isFinite(u))).toBe(true);
    expect(found.converged).toBe(true);
  },
);

test.each(lanczosStarts)('Lanczos1, exact to thirteen digits, gives its parameters back from %d, …', (...start) => {
  const truth = [0.0951, 1, 0.8607, 3, 1.5576, 5];
  const y = lanczosAt.map((x) => Number(lanczos(x, truth).toExponential(12)));
  const found = fitNonlinear(lanczos, { x: lanczosAt, y }, start);
  truth.forEach((value, k) => expect(digitsOf(found.parameters[k] as number, value)).toBeGreaterThan(8.5));
});

const bell = (x: number, v: B, k: number) => b(v, k) * exp(-(((x - b(v, k + 1)) / b(v, k + 2)) ** 2));
const peaks: Model<number> = (x, v) => b(v, 1) * exp(-b(v, 2) * x) + bell(x, v, 3) + bell(x, v, 6);
const chwirut: Model<number> = (x, v) => exp(-b(v, 1) * x) / (b(v, 2) + b(v, 3) * x);

interface Made {
  name: string;
  model: Model<number>;
  x: number[];
  truth: number[];
  sigma: number;
  starts: [number[], number[]];
}

/** Ranges, parameters, noise and starts of the certified sets. */
const made: Made[] = [
  {
    name: 'Hahn1, a quotient of two cubics',
    model: (x, v) =>
      (b(v, 1) + b(v, 2) * x + b(v, 3) * x ** 2 + b(v, 4) * x ** 3) / (1 + b(v, 5) * x + b(v, 6) * x ** 2 + b(v, 7) * x ** 3),
    x: spread(14, 851, 236),
    truth: [1.0776351733, -0.12269296921, 4.086375061e-3, -1.4262662514e-6, -5.7609940901e-3, 2.4053735503e-4, -1.2314450199e-7],
    sigma: 0.0818,
    starts: [
      [10, -1, 0.05, -1e-5, -0.05, 0.001, -1e-6],
      [1, -0.1, 0.005, -1e-6, -0.005, 0.0001, -1e-7],
    ],
  },
  {
    name: 'Bennett5, a narrow valley',
    model: (x, v) => b(v, 1) * (b(v, 2) + x) ** (-1 / b(v, 3)),
    x: spread(7.447168, 28, 154),
    truth: [-2523.5058043, 46.736564644, 0.93218483193],
    sigma: 1.8629e-3,
    starts: [
      [-2000, 50, 0.8],
      [-1500, 45, 0.85],
    ],
  },
  {
    name: 'Kirby2, a quotient of two parabolas',
    model: (x, v) => (b(v, 1) + b(v, 2) * x + b(v, 3) * x * x) / (1 + b(v, 4) * x + b(v, 5) * x * x),
    x: spread(9.65, 372, 151),
    truth: [1.6745063063, -0.13927397867, 2.5961181191e-3, -1.724181187e-3, 2.1664802578e-5],
    sigma: 0.1635,
    starts: [
      [2, -0.1, 0.003, -0.001, 0.00001],
      [1.5, -0.15, 0.0025, -0.0015, 0.00002],
    ],
  },
  {
    name: 'Chwirut1',
    model: chwirut,
    x: spread(0.5, 6, 214),
    truth: [0.1902781837, 6.1314004477e-3, 1.0530908399e-2],
    sigma: 3.36,
    starts: [
      [0.1, 0.01, 0.02],
      [0.15, 0.008, 0.01],
    ],
  },
  {
    name: 'Gauss2, two peaks that overlap on a decay',
    model: peaks,
    x: spread(1, 250, 250),
    truth: [99.018328406, 1.0994945399e-2, 101.88022528, 107.03095519, 23.578584029, 72.045589471, 153.27010194, 19.525972636],
    sigma: 2.27,
    starts: [
      [96, 0.009, 103, 106, 18, 72, 151, 18],
      [98, 0.0105, 103, 105, 20, 73, 150, 20],
    ],
  },
  {
    name: 'Gauss3, two peaks that hide one another',
    model: peaks,
    x: spread(1, 250, 250),
    truth: [98.94036897, 1.0945879335e-2, 100.69553078, 111.63619459, 23.300500029, 73.705031418, 147.76164251, 19.66822123],
    sigma: 2.27,
    starts: [
      [94.9, 0.009, 90.1, 113, 20, 73.8, 140, 20],
      [96, 0.0096, 80, 110, 25, 74, 139, 25],
    ],
  },
];

test.each(made.flatMap((set) => [0, 1].map((which) => ({ ...set, which }))))(
  'data like those of $name: start $which ends where the fit from the truth ends',
  ({ model, x, truth, sigma, starts, which }) => {
    const normal = normalDeviates(20270);
    const y = x.map((at) => model(at, truth) + sigma * normal());
    const fromTruth = fitNonlinear(model, { x, y }, truth);
    const found = fitNonlinear(model, { x, y }, starts[which] as number[]);
    expect(digitsOf(found.residualSumOfSquares, fromTruth.residualSumOfSquares)).toBeGreaterThan(11);
    found.parameters.forEach((value, k) => expect(digitsOf(value, fromTruth.parameters[k] as number)).toBeGreaterThan(7));
    // The sum of squares of so many residuals of known σ is χ².
    const freedom = found.degreesOfFreedom;
    expect(Math.abs(found.residualSumOfSquares / sigma ** 2 / freedom - 1)).toBeLessThan(4 * Math.sqrt(2 / freedom));
  },
);

test('Nelson, a model of two variables', () => {
  const x = [1, 2, 4, 8, 16, 32, 48, 64].flatMap((weeks) =>
    [180, 225, 250, 275].flatMap((celsius) => Array.from({ length: 4 }, () => [weeks, celsius] as const)),
  );
  const model: Model<readonly [number, number]> = ([weeks, celsius], v) => b(v, 1) - b(v, 2) * weeks * exp(-b(v, 3) * celsius);
  const truth = [2.5906836021, 5.6177717026e-9, -5.7701013174e-2];
  const normal = normalDeviates(64);
  const y = x.map((at) => model(at, truth) + 0.1743 * normal());
  const fromTruth = fitNonlinear(model, { x, y }, truth);
  for (const start of [
    [2, 0.0001, -0.01],
    [2.5, 5e-9, -0.05],
  ]) {
    const found = fitNonlinear(model, { x, y }, start);
    found.parameters.forEach((value, k) => expect(digitsOf(value, fromTruth.parameters[k] as number)).toBeGreaterThan(7));
  }
});
