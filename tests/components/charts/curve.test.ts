import * as fc from 'fast-check';
import { extent, gapOf, lowerBound, valueAt } from '@/components/charts/curve';
import { panned, zoomed } from '@/components/charts/time-plot-types';
import { niceTicks } from '@/shared/lib/ticks';

test('the first index at or after a value is found', () => {
  fc.assert(
    fc.property(fc.array(fc.integer({ min: -50, max: 50 })), fc.integer({ min: -60, max: 60 }), (values, x) => {
      const sorted = [...values].sort((a, b) => a - b);
      const found = lowerBound(sorted, x);
      expect(sorted.slice(0, found).every((value) => value < x)).toBe(true);
      expect(sorted.slice(found).every((value) => value >= x)).toBe(true);
    }),
  );
});

test('between samples the value is interpolated, in a gap there is none', () => {
  const series = { x: [0, 10, 20, 500, 510], y: [0, 1, 2, 5, 6] };
  expect(gapOf(series.x)).toBe(80);
  expect(valueAt(series, 15)).toBeCloseTo(1.5);
  expect(valueAt(series, 250)).toBeNull();
  expect(valueAt(series, 600)).toBeNull();
  expect(extent(series, 5, 30)).toEqual([1, 2]);
  expect(extent(series, 100, 200)).toBeNull();
});

test('ticks are round, inside the span, and about as many as asked for', () => {
  fc.assert(
    fc.property(fc.double({ min: -1e4, max: 1e4, noNaN: true }), fc.double({ min: 1e-3, max: 1e4, noNaN: true }), (from, span) => {
      const { values } = niceTicks(from, from + span, 5);
      expect(values.length).toBeGreaterThanOrEqual(2);
      expect(values.length).toBeLessThanOrEqual(11);
      for (const value of values) {
        expect(value).toBeGreaterThanOrEqual(from - span * 1e-6);
        expect(value).toBeLessThanOrEqual(from + span * (1 + 1e-6));
      }
    }),
  );
  expect(niceTicks(6.6, 6.75, 3)).toEqual({ values: [6.6, 6.65, 6.7, 6.75].map((value) => expect.closeTo(value, 9)), decimals: 2 });
});

test('zooming keeps the point under the finger and stays within the data', () => {
  const whole = { from: 0, to: 1_000_000 };
  const closer = zoomed(whole, whole, { at: 250_000, factor: 0.5 });
  expect((250_000 - closer.from) / (closer.to - closer.from)).toBeCloseTo(0.25, 9);
  expect(zoomed(closer, whole, { at: 250_000, factor: 100 })).toEqual(whole);
  expect(panned(closer, whole, -1e9).from).toBe(0);
  expect(panned(closer, whole, 1e9).to).toBe(1_000_000);
});

test('a span too small to count in ends at once without ticks', () => {
  expect(niceTicks(2.374, 2.374 + Number.EPSILON * 2, 5).values).toEqual([]);
});
