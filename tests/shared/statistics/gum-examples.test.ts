import { derivative } from '@/shared/evaluation/budget';
import { studentTQuantile } from '@/shared/statistics/student-t';
import { at, bilinear } from '@/shared/statistics/symmetric';
import { effectiveDegreesOfFreedom } from '@/shared/statistics/weighted-mean';
import { relativeDifference } from '../../support/check-data';

/** The worked examples H.1 and H.2 of JCGM 100:2008, with the parts that budgets of G are made of; full digits from an independent implementation. */

type Inputs = Record<string, number>;

/** ∂f/∂name at the inputs. */
const slope = (f: (inputs: Inputs) => number, inputs: Inputs, name: string, step: number) =>
  derivative((h) => f({ ...inputs, [name]: (inputs[name] as number) + h }), step);

describe('H.1, an end gauge', () => {
  // l = l_S + d − l_S (δα θ + α_S δθ), lengths in nm.
  const inputs = { standard: 50_000_623, difference: 215, deltaAlpha: 0, theta: -0.1, alpha: 11.5e-6, deltaTheta: 0 };
  const length = ({ standard = 0, difference = 0, deltaAlpha = 0, theta = 0, alpha = 0, deltaTheta = 0 }: Inputs) =>
    standard + difference - standard * (deltaAlpha * theta + alpha * deltaTheta);
  const ofDifference = [
    { contribution: 5.8, nu: 24 },
    { contribution: 3.9, nu: 5 },
    { contribution: 6.7, nu: 8 },
  ];
  const differenceU = Math.hypot(...ofDifference.map(({ contribution }) => contribution));
  const differenceNu = effectiveDegreesOfFreedom(ofDifference);
  const known = [
    { name: 'standard', u: 25, nu: 18, step: 1e3 },
    { name: 'difference', u: differenceU, nu: differenceNu, step: 10 },
    { name: 'deltaAlpha', u: 1e-6 / Math.sqrt(3), nu: 50, step: 1e-6 },
    { name: 'deltaTheta', u: 0.05 / Math.sqrt(3), nu: 2, step: 0.01 },
    // Neither the temperature nor the coefficient of the standard counts in the first order.
    { name: 'theta', u: Math.hypot(0.2, 0.5 / Math.SQRT2), nu: Infinity, step: 0.1 },
    { name: 'alpha', u: 2e-6 / Math.sqrt(3), nu: Infinity, step: 1e-6 },
  ];
  const contributions = known.map(({ name, u, nu, step }) => ({ contribution: slope(length, inputs, name, step) * u, nu }));
  const u = Math.hypot(...contributions.map(({ contribution }) => contribution));

  test('the difference of five comparisons has 9.7 nm and 25.6 degrees of freedom', () => {
    expect(relativeDifference(differenceU, 9.681941954)).toBeLessThan(1e-9);
    expect(relativeDifference(differenceNu, 25.447251)).toBeLessThan(1e-7);
  });

  test('each contribution, and 32 nm together', () => {
    const expected = [25, 9.68194, 2.8867873, 16.599027, 0, 0];
    contributions.forEach(({ contribution }, k) => expect(Math.abs(contribution)).toBeCloseTo(expected[k] as number, 5));
    expect(relativeDifference(u, 31.66387911101)).toBeLessThan(1e-8);
    expect(relativeDifference(u * u, 1002.60124)).toBeLessThan(1e-8);
    expect(relativeDifference(known.find(({ name }) => name === 'theta')?.u ?? NaN, 0.4062019202)).toBeLessThan(1e-9);
    expect(length(inputs)).toBe(50_000_838);
  });

  test('16 degrees of freedom, and an expanded uncertainty of 93 nm at 99 %', () => {
    const nu = effectiveDegreesOfFreedom(contributions);
    expect(relativeDifference(nu, 16.75185574)).toBeLessThan(1e-7);
    expect(relativeDifference(studentTQuantile(0.995, Math.floor(nu)) * u, 92.483276)).toBeLessThan(1e-7);
    expect(relativeDifference(studentTQuantile(0.975, Math.floor(nu)) * u, 67.124425)).toBeLessThan(1e-7);
  });

  test('the second order, where the first vanishes, makes it 34 nm', () => {
    const mixed = (a: string, b: string) => {
      const [one, two] = [a, b].map((name) => known.find((input) => input.name === name)) as [
        (typeof known)[number],
        (typeof known)[number],
      ];
      const both = derivative((h) => slope(length, { ...inputs, [a]: inputs[a as keyof typeof inputs] + h }, b, two.step), one.step);
      return Math.abs(both) * one.u * two.u;
    };
    const terms = [mixed('deltaAlpha', 'theta'), mixed('alpha', 'deltaTheta')];
    expect(relativeDifference(terms[0] as number, 11.726186)).toBeLessThan(1e-6);
    expect(relativeDifference(terms[1] as number, 1.6666874)).toBeLessThan(1e-6);
    expect(relativeDifference(Math.hypot(u, ...terms), 33.806545)).toBeLessThan(1e-7);
  });
});

describe('H.2, resistance, reactance and impedance measured together', () => {
  const series = [
    [5.007, 4.994, 5.005, 4.99, 4.999],
    [19.663e-3, 19.639e-3, 19.64e-3, 19.685e-3, 19.678e-3],
    [1.0456, 1.0438, 1.0468, 1.0428, 1.0433],
  ];
  const mean = (values: readonly number[]) => values.reduce((sum, value) => sum + value, 0) / values.length;
  const means = series.map(mean);
  /** Of the means: what was observed at one time belongs together. */
  const covariance = series.map((a, i) =>
    series.map(
      (b, j) => a.reduce((sum, value, k) => sum + (value - (means[i] as number)) * ((b[k] as number) - (means[j] as number)), 0) / 20,
    ),
  );
  const models: Record<string, (inputs: readonly number[]) => number> = {
    R: ([v = 0, i = 0, phi = 0]) => (v / i) * Math.cos(phi),
    X: ([v = 0, i = 0, phi = 0]) => (v / i) * Math.sin(phi),
    Z: ([v = 0, i = 0]) => v / i,
  };
  const gradient = (name: string) =>
    means.map((value, k) =>
      derivative((h) => (models[name] as (typeof models)[string])(means.map((one, j) => (j === k ? value + h : one))), 1e-3 * value),
    );
  const uOf = (name: string) => Math.sqrt(bilinear(gradient(name), covariance, gradient(name)));

  // Published: 127.732 (0.071), 219.847 (0.295), 254.260 (0.236) ohm.
  test.each([
    ['R', 127.7321699281, 0.071071407397],
    ['X', 219.8465119126, 0.2955816773586],
    ['Z', 254.259701948, 0.2363361300824],
  ])('%s is %p ohm with u %p, correlations of the observations included', (name, value, u) => {
    expect(relativeDifference((models[name] as (typeof models)[string])(means), value)).toBeLessThan(1e-11);
    expect(relativeDifference(uOf(name), u)).toBeLessThan(1e-8);
  });

  test('the observations have the published u and correlation', () => {
    expect(relativeDifference(Math.sqrt(covariance[0]?.[0] ?? NaN), 0.003209361307176)).toBeLessThan(1e-10);
    expect(relativeDifference(Math.sqrt(covariance[1]?.[1] ?? NaN), 9.471008394041e-6)).toBeLessThan(1e-10);
    expect(relativeDifference(Math.sqrt(covariance[2]?.[2] ?? NaN), 7.520638270785e-4)).toBeLessThan(1e-10);
    for (const [i, j, published] of [
      [0, 1, -0.3553112198175],
      [0, 2, 0.85762421084],
      [1, 2, -0.6451112176892],
    ] as const)
      expect(relativeDifference(at(covariance, i, j) / Math.sqrt(at(covariance, i, i) * at(covariance, j, j)), published)).toBeLessThan(
        1e-9,
      );
  });

  // Published: −0.588, −0.485, 0.993.
  test.each([
    ['R', 'X', -0.5884297844236],
    ['R', 'Z', -0.48525922421],
    ['X', 'Z', 0.992511648949],
  ])('%s and %s are correlated by %p', (a, b, expected) => {
    expect(relativeDifference(bilinear(gradient(a), covariance, gradient(b)) / (uOf(a) * uOf(b)), expected)).toBeLessThan(1e-7);
  });

  // Published as 127.732, 219.847 and 254.260 ohm too.
  test.each([
    ['R', 127.7316304828],
    ['X', 219.8468946033],
    ['Z', 254.2600495867],
  ])('%s by the second approach, each row by itself: %p ohm', (name, value) => {
    const rows = [0, 1, 2, 3, 4].map((k) => (models[name] as (typeof models)[string])(series.map((one) => one[k] as number)));
    expect(relativeDifference(mean(rows), value)).toBeLessThan(1e-11);
  });
});
