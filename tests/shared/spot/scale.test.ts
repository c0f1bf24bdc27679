import { leastSquares } from '@/shared/statistics/least-squares';
import { fitScale, mmAt, uMmAt } from '@/shared/spot/scale';

/** A hand-made fit: five marks about their mean, Σ(px − 300)² = 100 000, Σ(px − 300)(mm − 30) = 10 010. */
const marks = [
  { px: 100, mm: 10.1 },
  { px: 200, mm: 19.9 },
  { px: 300, mm: 29.9 },
  { px: 400, mm: 40.0 },
  { px: 500, mm: 50.1 },
];

test('marks give a straight scale with residuals, as by hand', () => {
  const scale = fitScale(marks, 0.01);
  if (scale === null) throw new Error('no scale');
  expect(scale.meanPx).toBe(300);
  expect(scale.meanMm).toBeCloseTo(30, 12);
  expect(scale.mmPerPx).toBeCloseTo(0.1001, 12);
  const byHand = [0.12, -0.09, -0.1, -0.01, 0.08];
  scale.residualsMm.forEach((residual, i) => expect(residual).toBeCloseTo(byHand[i] as number, 10));
  // √((0.0144 + 0.0081 + 0.01 + 0.0001 + 0.0064) / 3)
  expect(scale.scatterMm).toBeCloseTo(0.114017543, 8);
  expect(scale.uMmPerPx).toBeCloseTo(0.114017543 / Math.sqrt(100_000), 10);
  expect(scale.uMeanMm).toBeCloseTo(0.114017543 / Math.sqrt(5), 8);
  expect(mmAt(scale, 350)).toBeCloseTo(35.005, 10);
});

test('the general least squares say the same', () => {
  const scale = fitScale(marks, 0.01);
  const general = leastSquares(
    [marks.map(() => 1), marks.map(({ px }) => px)],
    marks.map(({ mm }) => mm),
  );
  const [[varianceA = 0, covariance = 0] = [], [, varianceB = 0] = []] = general.unitCovariance;
  const s2 = general.ssr / 3;
  const px = 480;
  const value = (general.coefficients[0] as number) + (general.coefficients[1] as number) * px;
  const u = Math.sqrt(s2 * (varianceA + 2 * px * covariance + px * px * varianceB));
  if (scale === null) throw new Error('no scale');
  expect(mmAt(scale, px)).toBeCloseTo(value, 10);
  expect(uMmAt(scale, px, 0)).toBeCloseTo(u, 10);
  expect(uMmAt(scale, px, 2)).toBeCloseTo(Math.hypot(u, 2 * 0.1001), 10);
});

test('two marks have no residuals: what was stated counts, also where the scale runs the other way', () => {
  const scale = fitScale(
    [
      { px: 0, mm: 100 },
      { px: 500, mm: 50 },
    ],
    0.2,
  );
  expect(scale).toMatchObject({ mmPerPx: -0.1, scatterMm: null });
  expect(scale?.uMmPerPx).toBeCloseTo(0.2 / Math.sqrt(2 * 250 ** 2), 12);
});

test('where there is no scale there is none', () => {
  expect(fitScale([], 0.2)).toBeNull();
  expect(fitScale([{ px: 4, mm: 1 }], 0.2)).toBeNull();
  expect(
    fitScale(
      [
        { px: 4, mm: 1 },
        { px: 4, mm: 9 },
      ],
      0.2,
    ),
  ).toBeNull();
  expect(
    fitScale(
      [
        { px: 4, mm: 9 },
        { px: 90, mm: 9 },
      ],
      0.2,
    ),
  ).toBeNull();
});
