import { abaDifference } from '@/shared/statistics/drift';
import { cosine, offset, ringDownSegment, sine, slope } from '@/shared/statistics/ring-down';
import { ringDownStart } from '@/shared/statistics/ring-down-start';
import { at, bilinear, invertSymmetric } from '@/shared/statistics/symmetric';
import { fitSeparable, solveAtFixedAlpha, type SeparableFit } from '@/shared/statistics/variable-projection';
import { relativeDifference } from '../../support/check-data';
import { normalDeviates, sp1065Uniforms } from '../../support/lcg';

const omega = 0.01495996501709;
const gamma = 0.0009368293487488;

/** Three segments of 60 data each with fixed noise; the results below come from an independent dense fit of all 14 parameters. */
function threeSegments() {
  const noise = sp1065Uniforms(180).map((u) => (u - 0.5) * 2e-5);
  const c0 = [1.2e-3, -1.1e-3, 1.25e-3];
  const c1 = [2e-8, 1e-8, 3e-8];
  const a = [-2e-3, 2.1e-3, -1.9e-3];
  const b = [1e-4, -2e-4, 3e-4];
  return [0, 1, 2].map((segment) => {
    const tS = Float64Array.from({ length: 60 }, (_, k) => 5 + 10 * k);
    const pick = (list: number[]) => list[segment] as number;
    const y = tS.map((t, k) => {
      const ring = Math.exp(-gamma * t) * (pick(a) * Math.cos(omega * t) + pick(b) * Math.sin(omega * t));
      return pick(c0) + pick(c1) * (t - 300) + ring + (noise[60 * segment + k] as number);
    });
    return { tS, y };
  });
}

const coefficients = (fit: SeparableFit, index: number) => fit.segments.map((segment) => segment.coefficients[index] as number);

describe('the fit of three dwells that share period and decay', () => {
  const data = threeSegments();
  const fit = fitSeparable(data.map(ringDownSegment), [0.0155, 0.0012]);

  test.each([
    ['frequency', () => fit.alpha[0], 0.014963664922209],
    ['decay rate', () => fit.alpha[1], 0.000937617727986],
    ['residual sum', () => fit.ssr, 5.73055114799e-9],
    ['scatter', () => Math.sqrt(fit.variance), 5.87549082697e-6],
    ['u of the frequency', () => Math.sqrt(at(fit.alphaCovariance, 0, 0)), 5.425259461e-6],
    ['u of the decay rate', () => Math.sqrt(at(fit.alphaCovariance, 1, 1)), 2.598317044e-6],
  ])('gives the published %s', (_name, value, expected) => {
    expect(relativeDifference(value() as number, expected)).toBeLessThan(1e-9);
  });

  test.each([
    ['centres', offset, [0.00120012104233, -0.001101588070767, 0.001250447282704]],
    ['slopes', slope, [2.079619084e-8, 2.28657525e-8, 3.033753279e-8]],
    ['cosine amplitudes', cosine, [-0.00199958377225, 0.00210082309482, -0.00190123082849]],
    ['sine amplitudes', sine, [9.698063895e-5, -0.0001975554306, 0.0002977423726]],
  ] as const)('gives the published %s', (_name, index, expected) => {
    coefficients(fit, index).forEach((value, k) => expect(relativeDifference(value, expected[k] as number)).toBeLessThan(3e-9));
  });

  test('has the published degrees of freedom, and carries the uncertainty of period and decay into the centres', () => {
    expect(fit.degreesOfFreedom).toBe(166);
    const published = [8.042149197e-7, 8.047338996e-7, 8.031669066e-7];
    fit.segments.forEach((segment, k) => {
      const shift = segment.shift[offset] as number[];
      const u = Math.sqrt(fit.variance * at(segment.inverseNormal, 0, 0) + bilinear(shift, fit.alphaCovariance, shift));
      expect(relativeDifference(u, published[k] as number)).toBeLessThan(1e-8);
    });
  });

  test('leaves a drift-free difference as published', () => {
    const series = coefficients(fit, offset).map((value, k) => ({ timeS: 900 * k, side: (k % 2 === 0 ? 1 : -1) as 1 | -1, value }));
    expect(relativeDifference(abaDifference(series).value / 2, 0.00116343611664)).toBeLessThan(1e-9);
  });

  test('ends at the same place from far start values once a start has been sought', () => {
    const start = ringDownStart(data, null);
    if (start === null) throw new Error('a start is found');
    expect(relativeDifference(start.omega, omega)).toBeLessThan(1e-2);
    const again = fitSeparable(data.map(ringDownSegment), [start.omega, start.gamma]);
    expect(relativeDifference(again.alpha[0] as number, fit.alpha[0] as number)).toBeLessThan(1e-9);
  });

  test('is not led astray by a wrong hint', () => {
    const start = ringDownStart(data, { omega: 0.03, gamma: 0.001 });
    expect(relativeDifference(start?.omega ?? 0, omega)).toBeLessThan(1e-2);
  });
});

describe('the start of a fit', () => {
  test.each([20, 90, 300, 800])('is found for a period of %d s in dwells of 900 s with noise and drift', (periodS) => {
    const normal = normalDeviates(7);
    const w = (2 * Math.PI) / periodS;
    const data = [1, -1, 1, -1].map((side) => {
      const tS = Float64Array.from({ length: 225 }, (_, k) => 2 + 4 * k);
      const y = tS.map((t) => side * 1e-3 + 3e-8 * t - side * 2e-3 * Math.exp((-w * t) / 16) * Math.cos(w * t) + 2e-5 * normal());
      return { tS, y };
    });
    expect(relativeDifference(ringDownStart(data, null)?.omega ?? 0, w)).toBeLessThan(0.03);
  });
});

describe('a shift of the frequency by the sources', () => {
  test('is taken off, so that the free frequency comes out', () => {
    const shifts = [-2e-6, 3e-6];
    const data = shifts.map((shift) => {
      const w = Math.sqrt(omega * omega + shift);
      const tS = Float64Array.from({ length: 90 }, (_, k) => 10 * k);
      return { tS, shift, y: tS.map((t) => 1e-3 + Math.exp(-gamma * t) * (2e-3 * Math.cos(w * t) + 1e-4 * Math.sin(w * t))) };
    });
    const fit = fitSeparable(data.map(ringDownSegment), [0.0152, 0.001]);
    expect(relativeDifference(fit.alpha[0] as number, omega)).toBeLessThan(1e-9);
    expect(relativeDifference(fit.alpha[1] as number, gamma)).toBeLessThan(1e-7);
  });
});

describe('the inflation of the variance of one centre by the other columns', () => {
  // Independent values for 4000 midpoints, Q = 8, dwell of x periods: ω and γ known, and free with the ringing along the cosine.
  test.each([
    { x: 0.75, known: 1.3923017, free: 137.89838 },
    { x: 1, known: 1.0199333, free: 7.9775762 },
    { x: 1.25, known: 1.0697652, free: 1.5622456 },
    { x: 2, known: 1.008894, free: 1.2011584 },
    { x: 3, known: 1.0076338, free: 1.0799362 },
  ])('is as published for $x periods', ({ x, known, free }) => {
    const count = 4000;
    const spanS = (x * 2 * Math.PI) / omega;
    const tS = Float64Array.from({ length: count }, (_, k) => ((k + 0.5) * spanS) / count);
    const y = tS.map((t) => Math.exp(-gamma * t) * Math.cos(omega * t));
    const fit = solveAtFixedAlpha([ringDownSegment({ tS, y })], [omega, gamma]);
    const segment = fit.segments[0];
    if (segment === undefined) throw new Error('one segment was given');
    const alone = count * at(segment.inverseNormal, 0, 0);
    expect(relativeDifference(alone, known)).toBeLessThan(1e-4);
    const unitCovariance = fit.alphaCovariance.map((row) => row.map((value) => value / fit.variance));
    const shift = segment.shift[offset] as number[];
    expect(relativeDifference(alone + count * bilinear(shift, unitCovariance, shift), free)).toBeLessThan(1e-4);
  });
});

describe('residuals that hang together', () => {
  const tS = Float64Array.from({ length: 900 }, (_, k) => k);
  const columns = ringDownSegment({ tS, y: tS }).basis([omega, gamma]).columns;
  const inverse = invertSymmetric(columns.map((a) => columns.map((b) => a.reduce((sum, value, i) => sum + value * (b[i] as number), 0))));
  /** How the centre is made of the data. */
  const weights = tS.map((_, i) => columns.reduce((sum, column, k) => sum + at(inverse, offset, k) * (column[i] as number), 0));

  // Autoregressive of the first order, 900 data of a second: (1 + ρ)/(1 − ρ) would be 3, 19 and 199.
  test.each([
    [0.5, 2.99631879],
    [0.9, 18.8336395],
    [0.99, 177.946792],
  ])('with ρ = %d raise the variance of a centre by the published factor (C6)', (rho, factor) => {
    const lagged = Float64Array.from(tS, (_, lag) => weights.reduce((sum, w, i) => sum + w * (weights[i + lag] ?? 0), 0));
    const variance = lagged.reduce((sum, value, lag) => sum + (lag === 0 ? 1 : 2) * rho ** lag * value, 0);
    expect(relativeDifference(variance / at(inverse, offset, offset), factor)).toBeLessThan(1e-8);
  });
});
