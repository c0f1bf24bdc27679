import * as fc from 'fast-check';
import { reversalSoFar } from '@/shared/conditions/relative-u';

const value = fc.double({ min: -1e-4, max: 1e-4, noNaN: true });
const dwell = (index: number, centreRad: number, good = true) => ({
  side: index % 2 === 0 ? ('near' as const) : ('far' as const),
  midUtcMs: 840_000 * index,
  centreRad,
  good,
});

/** By hand: three pairs without drift, near at 1.001, 0.999, 1.000 mrad, far at −1.000, −1.001, −0.999 mrad. */
test('near minus far and its scatter', () => {
  const centres = [1.001, -1.0, 0.999, -1.001, 1.0, -0.999];
  const found = reversalSoFar(centres.map((mrad, index) => dwell(index, mrad / 1000)));
  expect(found?.differenceRad).toBeCloseTo(0.002, 5);
  expect(found?.reversals).toBe(5);
  // The scatter of a dwell is near 1 µrad: u of a difference of six is of that order over 2 mrad.
  expect(found?.relativeU).toBeGreaterThan(1e-4);
  expect(found?.relativeU).toBeLessThan(1e-3);
});

test('too few dwells tell nothing, and dwells that are not good have no say', () => {
  expect(reversalSoFar([])).toBeNull();
  expect(reversalSoFar([dwell(0, 1e-3)])).toBeNull();
  expect(reversalSoFar([dwell(0, 1e-3), dwell(1, -1e-3)])).toMatchObject({ reversals: 1, relativeU: null });
  const good = [dwell(0, 1e-3), dwell(1, -1e-3), dwell(2, 1.1e-3), dwell(3, -1.05e-3), dwell(4, 1e-3)];
  expect(reversalSoFar([...good, dwell(5, 7, false)])).toEqual(reversalSoFar(good));
});

test('a straight drift and another zero change nothing; twice the deflection is twice the difference at the same relative u', () => {
  fc.assert(
    fc.property(fc.array(value, { minLength: 5, maxLength: 24 }), value, value, (noise, zero, slope) => {
      const plain = noise.map((off, index) => dwell(index, (index % 2 === 0 ? 1e-3 : -1e-3) + off));
      const moved = plain.map((one, index) => ({ ...one, centreRad: one.centreRad + zero + slope * index }));
      const twice = plain.map((one) => ({ ...one, centreRad: 2 * one.centreRad }));
      const [a, b, c] = [reversalSoFar(plain), reversalSoFar(moved), reversalSoFar(twice)];
      expect(b?.differenceRad).toBeCloseTo(a?.differenceRad ?? 0, 12);
      expect(b?.relativeU).toBeCloseTo(a?.relativeU ?? 0, 9);
      expect(c?.differenceRad).toBeCloseTo(2 * (a?.differenceRad ?? 0), 12);
      expect(c?.relativeU).toBeCloseTo(a?.relativeU ?? 0, 9);
    }),
    { numRuns: 50 },
  );
});
