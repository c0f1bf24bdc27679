import { boxAverage } from '@/shared/statistics/box-average';
import { leastSquares } from '@/shared/statistics/least-squares';
import { studentTProbability, studentTQuantile } from '@/shared/statistics/student-t';
import { invertSymmetric, SingularMatrixError, solveSymmetric } from '@/shared/statistics/symmetric';
import { effectiveDegreesOfFreedom, weightedMean } from '@/shared/statistics/weighted-mean';
import { readFileSync } from 'node:fs';
import { checkDataPath, relativeDifference } from '../../support/check-data';

describe('the t distribution', () => {
  // JCGM 100:2008, H.1 and table G.2 (rounded there); full digits from an independent implementation.
  test.each([
    { p: 0.995, nu: 16, t: 2.9207816224251 },
    { p: 0.975, nu: 16, t: 2.1199052992212546 },
    { p: 0.975, nu: 13, t: 2.1603686564627913 },
    { p: 0.975, nu: Infinity, t: 1.959963984540054 },
    { p: 0.999, nu: Infinity, t: 3.090232306167813 },
    { p: 0.975, nu: 1, t: 12.706204736174698 },
    { p: 0.95, nu: 2, t: 2.919985580353726 },
  ])('has the quantile $t at $p for $nu degrees of freedom', ({ p, nu, t }) => {
    expect(relativeDifference(studentTQuantile(p, nu), t)).toBeLessThan(1e-9);
    expect(studentTQuantile(1 - p, nu)).toBeCloseTo(-t, 8);
    expect(studentTProbability(t, nu)).toBeCloseTo(p, 10);
  });

  test('gives the published p-values of a test of equivalence', () => {
    expect(relativeDifference(2 * studentTProbability(-0.8383336521426425, 11), 0.4196872891269355)).toBeLessThan(1e-9);
    expect(relativeDifference(studentTProbability(-4.36511660253583, 11), 0.0005633291568629)).toBeLessThan(1e-9);
  });

  test('refuses a probability that is none', () => {
    expect(() => studentTQuantile(1, 5)).toThrow('between 0 and 1');
  });
});

describe('the weighted mean', () => {
  test('combines the toy set as published', () => {
    const values = [6.62, 6.71, 6.68, 6.8, 6.59].map((value, k) => ({ value, u: [0.05, 0.04, 0.08, 0.06, 0.05][k] as number }));
    const found = weightedMean(values);
    expect(relativeDifference(found.mean, 6.675741501681)).toBeLessThan(1e-11);
    expect(relativeDifference(found.u, 0.02319300707)).toBeLessThan(1e-9);
    expect(relativeDifference(found.chiSquared, 9.20878688831)).toBeLessThan(1e-10);
    expect(relativeDifference(found.birgeRatio as number, 1.517299154)).toBeLessThan(1e-9);
  });

  test('combines the inputs of CODATA 2022 to the published consistency', () => {
    const path = checkDataPath('codata_G_inputs.csv');
    if (path === null) return;
    const rows = readFileSync(path, 'utf8')
      .trim()
      .split(/\r?\n/)
      .map((line) => line.split(','))
      .filter((cells) => Number.isFinite(Number(cells.at(-1))));
    const found = weightedMean(rows.map((cells) => ({ value: Number(cells.at(-2)), u: Number(cells.at(-1)) })));
    expect(rows).toHaveLength(16);
    // Q = 197.8399 is asserted in the tests of a published meta-analysis package.
    expect(relativeDifference(found.chiSquared, 197.839850347)).toBeLessThan(1e-9);
    expect(relativeDifference(found.mean, 6.67428983821)).toBeLessThan(1e-11);
    expect(relativeDifference(found.u, 3.758270097e-5)).toBeLessThan(1e-9);
    expect(relativeDifference(found.birgeRatio as number, 3.631710803)).toBeLessThan(1e-9);
  });

  test('lets an exact value decide alone', () => {
    expect(
      weightedMean([
        { value: 3, u: 0 },
        { value: 9, u: 0.1 },
      ]),
    ).toMatchObject({ mean: 3, u: 0 });
  });

  test('leaves the effective degrees of freedom of the worked example', () => {
    const found = effectiveDegreesOfFreedom([
      { contribution: 1, nu: 4 },
      { contribution: 2, nu: 9 },
      { contribution: 0.5, nu: Infinity },
    ]);
    expect(relativeDifference(found, 13.592465753424658)).toBeLessThan(1e-12);
    expect(effectiveDegreesOfFreedom([{ contribution: 1, nu: Infinity }])).toBe(Infinity);
  });
});

describe('box averages', () => {
  const gamma = 0.0009368293487488;
  const omega = 0.01495996501709;

  test('keep the damped oscillation exact: its amplitude takes the published factor', () => {
    const n = 100;
    const stepS = 0.1;
    const t = Float64Array.from({ length: 9000 }, (_, k) => stepS * (k + 0.5));
    const ring = (at: number) => Math.exp(-gamma * at) * Math.cos(omega * at);
    const boxes = boxAverage(
      t,
      t.map((at) => 0.3 + 1e-5 * at + ring(at)),
      n * stepS,
    );
    expect(boxes.t).toHaveLength(90);
    expect(boxes.samples).toBe(9000);
    // sinh(nλδ/2)/(n sinh(λδ/2)), λ = −γ + iω
    const gain = { re: 0.9990715020674, im: -0.0001167143859563 };
    boxes.y.forEach((y, k) => {
      const at = boxes.t[k] as number;
      const expected = Math.exp(-gamma * at) * (gain.re * Math.cos(omega * at) - gain.im * Math.sin(omega * at));
      expect(Math.abs(y - (0.3 + 1e-5 * at + expected))).toBeLessThan(1e-12);
    });
  });

  test('hold equal numbers of consecutive samples and never bridge a gap', () => {
    const t = Float64Array.from({ length: 207 }, (_, k) => (k < 104 ? k : k + 500));
    const boxes = boxAverage(t, t, 10);
    expect([...boxes.weight].every((w) => w === 10)).toBe(true);
    expect(boxes.samples).toBe(200);
    expect([...boxes.t].filter((at) => at > 104 && at < 604)).toEqual([]);
  });

  test('leave sparse samples as they are, and cut ragged ones by time', () => {
    const sparse = Float64Array.of(0, 20, 40, 60);
    expect([...boxAverage(sparse, sparse, 8).t]).toEqual([0, 20, 40, 60]);
    const ragged = Float64Array.from({ length: 400 }, (_, k) => k + 40 * Math.floor(k / 7));
    expect(boxAverage(ragged, ragged, 5).samples).toBe(400);
  });

  test('of nothing are nothing', () => {
    expect(boxAverage([], [], 5).samples).toBe(0);
  });
});

describe('linear least squares', () => {
  test('meets a polynomial of high order that normal equations would lose', () => {
    const x = Array.from({ length: 21 }, (_, k) => k);
    // The rule of NIST's Wampler1 (from memory): y = 1 + x + x² + x³ + x⁴ + x⁵, all coefficients 1.
    const columns = [0, 1, 2, 3, 4, 5].map((power) => x.map((v) => v ** power));
    const fit = leastSquares(
      columns,
      x.map((v) => 1 + v + v ** 2 + v ** 3 + v ** 4 + v ** 5),
    );
    fit.coefficients.forEach((c) => expect(c).toBeCloseTo(1, 7));
  });

  test('says so when a column depends on the others', () => {
    expect(() =>
      leastSquares(
        [
          [1, 1, 1, 1],
          [2, 2, 2, 2],
        ],
        [1, 2, 3, 4],
      ),
    ).toThrow(SingularMatrixError);
    expect(() => leastSquares([[1], [2]], [1])).toThrow(SingularMatrixError);
  });

  test('solves and inverts symmetric systems of mixed units', () => {
    const a = [
      [4e12, 2e3],
      [2e3, 5e-6],
    ];
    const x = solveSymmetric(a, [1e6, 1e-3]);
    expect(4e12 * (x[0] as number) + 2e3 * (x[1] as number)).toBeCloseTo(1e6, 3);
    expect((invertSymmetric(a)[0] as number[])[0]).toBeCloseTo(5e-6 / (4e12 * 5e-6 - 4e6), 20);
    expect(() =>
      solveSymmetric(
        [
          [1, 2],
          [2, 1],
        ],
        [1, 1],
      ),
    ).toThrow(SingularMatrixError);
  });
});
