import * as fc from 'fast-check';
import { cellsOf, coverOf, stretchesOf, topLevel, widthUs } from '@/server/store/sample-levels';

const eveningUs = Date.parse('2031-05-06T20:00:00Z') * 1000;
const us = fc.integer({ min: -40 * 86_400_000_000, max: 400 * 86_400_000_000 }).map((offset) => eveningUs + offset);

test('the pieces of a window follow each other without gap or overlap, each of whole buckets, few of them finer than the widest', () => {
  fc.assert(
    fc.property(us, us, fc.integer({ min: 0, max: topLevel }), (one, other, top) => {
      const [fromUs, toUs] = [Math.min(one, other), Math.max(one, other)];
      const pieces = coverOf({ fromUs, toUs }, top);
      expect(pieces.map((piece) => piece.fromUs)).toEqual(
        fromUs === toUs ? [] : [fromUs, ...pieces.slice(0, -1).map((piece) => piece.toUs)],
      );
      expect(pieces.at(-1)?.toUs).toBe(fromUs === toUs ? undefined : toUs);
      for (const { level, fromUs: from, toUs: to } of pieces) {
        if (level === null) expect(to - from).toBeLessThan(2 * widthUs(0));
        else {
          expect([Math.abs(from % widthUs(level)), Math.abs(to % widthUs(level))]).toEqual([0, 0]);
          // Seven before the next wider bucket begins, and seven after the last has ended.
          if (level < top) expect((to - from) / widthUs(level)).toBeLessThanOrEqual(14);
        }
      }
    }),
  );
});

test('a window of years is a few thousand buckets at most', () => {
  const pieces = coverOf({ fromUs: eveningUs + 1, toUs: eveningUs + 10 * 365 * 86_400_000_000 });
  const buckets = pieces.reduce((sum, { level, fromUs, toUs }) => sum + (level === null ? 0 : (toUs - fromUs) / widthUs(level)), 0);
  expect(buckets).toBeLessThan(5000);
});

test('cells are whole buckets, as many as asked for or fewer, and no more than 8 buckets wide below the widest level', () => {
  fc.assert(
    fc.property(fc.integer({ min: 1, max: 400 * 86_400 }), fc.integer({ min: 5, max: 2000 }), (spanS, cells) => {
      const { level, stepUs } = cellsOf(spanS * 1e6, cells);
      expect(stepUs % widthUs(level)).toBe(0);
      expect(Math.ceil((spanS * 1e6) / stepUs) + 1).toBeLessThanOrEqual(cells);
      if (level < topLevel) expect(stepUs / widthUs(level)).toBeLessThanOrEqual(8);
    }),
  );
});

test('instants lie in stretches of whole buckets, neighbours in one, in order, also before 1970', () => {
  const stretches = stretchesOf(Float64Array.of(5999.9996, 1999.9994, 4000, -0.001, 4001, 12_000));
  expect(stretches.map(({ fromUs, toUs }) => [fromUs / 1e6, toUs / 1e6])).toEqual([
    [-2, 2],
    [4, 8],
    [12, 14],
  ]);
});
