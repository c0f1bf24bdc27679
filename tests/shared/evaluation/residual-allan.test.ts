import { allanWords } from '@/components/evaluation/evaluation-words';
import { residualAllan } from '@/shared/evaluation/residual-allan';
import type { FitCurve } from '@/shared/evaluation/result';
import { normalDeviates } from '../../support/lcg';

const widthS = 7;
const bins = 120;

/** Dwells whose residuals are given; the model is a parabola, so that data and residuals are not the same. */
const dwells = (count: number, residual: (k: number, dwell: number) => number): FitCurve[] =>
  Array.from({ length: count }, (_, dwell) => {
    const tS = Array.from({ length: bins }, (_x, k) => widthS * (k + 0.5));
    const modelRad = tS.map((t) => 1e-9 * t * t);
    return { seq: dwell, station: 'near', startUtcMs: 0, tS, modelRad, dataRad: modelRad.map((y, k) => y + residual(k, dwell)) };
  });

test('white noise falls with the root of the averaging time, and the stated u covers its scatter', () => {
  const pulls: number[] = [];
  for (let seed = 1; seed <= 12; seed += 1) {
    const normal = normalDeviates(seed);
    const points = residualAllan(dwells(8, () => 1e-6 * normal()));
    expect(points.map(({ tauS }) => tauS)).toEqual([7, 14, 28, 56, 112, 224]);
    points.forEach(({ tauS, deviationRad, u }) => pulls.push((deviationRad - 1e-6 / Math.sqrt(tauS / widthS)) / u));
  }
  const rms = Math.sqrt(pulls.reduce((sum, pull) => sum + pull * pull, 0) / pulls.length);
  expect(rms).toBeGreaterThan(0.7);
  expect(rms).toBeLessThan(1.4);
});

test('a slow motion stands above the slope of white noise, and the words say from when on', () => {
  const normal = normalDeviates(3);
  const white = dwells(8, () => 1e-6 * normal());
  expect(allanWords(residualAllan(white))).toMatch(/ at 7\u202fs; from there it falls as white noise does, up to 3\u202fmin 44\u202fs\.$/);
  const slow = dwells(8, (k) => 1e-6 * normal() + 2e-6 * Math.sin((2 * Math.PI * k) / 60));
  expect(allanWords(residualAllan(slow))).toMatch(/beyond that it stands above: something slower/);
});

test('a gap between bins does not make two neighbours of what lies far apart', () => {
  const normal = normalDeviates(5);
  const whole = dwells(1, (k) => (k < 60 ? 0 : 1e-4) + 1e-6 * normal());
  const [curve] = whole as [FitCurve];
  const gap = { ...curve, tS: curve.tS.map((t, k) => (k < 60 ? t : t + 500)) };
  expect(residualAllan([gap])[0]?.deviationRad).toBeLessThan(2e-6);
  expect(residualAllan([curve])[0]?.deviationRad).toBeGreaterThan(5e-6);
});

// Degrees of freedom of the sum of the squared second differences of white noise: tr(M)²/tr(M²) with M their covariance, worked out apart.
test.each([
  [1000, 1, 666.2223],
  [60, 4, 19.1251],
  [120, 16, 9.1207],
])('the u of one dwell of %d bins, %d averaged, is that of %f degrees of freedom', (length, m, freedom) => {
  const normal = normalDeviates(9);
  const tS = Array.from({ length }, (_, k) => widthS * k);
  const curve = { seq: 1, station: 'near', startUtcMs: 0, tS, modelRad: tS.map(() => 0), dataRad: tS.map(() => normal()) };
  const { deviationRad, u } = residualAllan([curve]).find(({ tauS }) => tauS === m * widthS) ?? { deviationRad: NaN, u: NaN };
  expect(Math.abs((deviationRad / u) ** 2 / 2 / freedom - 1)).toBeLessThan(1e-5);
});

test('too little for a slope says nothing', () => {
  expect(allanWords(residualAllan([]))).toBeNull();
});
