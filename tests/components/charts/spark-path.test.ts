import { sparkPath } from '@/components/charts/spark-path';

const frame = { fromUtcMs: 0, toUtcMs: 100, gapMs: 30, widthPx: 200, heightPx: 28 };
const points = (path: string) => [...path.matchAll(/([ML])([\d.]+) ([\d.]+)/g)].map(([, act, x, y]) => [act, Number(x), Number(y)]);

test('the least stands at the bottom and the greatest at the top, 2 px from the edges, at their times', () => {
  const path = sparkPath({ x: [0, 25, 50], y: [10, 30, 20] }, { ...frame, range: { least: 10, greatest: 30 } });
  expect(points(path)).toEqual([
    ['M', 0, 26],
    ['L', 50, 2],
    ['L', 100, 14],
  ]);
});

test('a gap is a gap, and what is no number is left out', () => {
  const path = sparkPath({ x: [0, 10, 20, 60, 70], y: [1, NaN, 1, 3, 3] }, { ...frame, range: { least: 1, greatest: 3 } });
  expect(points(path).map(([act]) => act)).toEqual(['M', 'L', 'M', 'L']);
});

test('a channel that stays the same runs through the middle', () => {
  const path = sparkPath({ x: [0, 10], y: [5, 5] }, { ...frame, range: { least: 5, greatest: 5 } });
  expect(points(path).map(([, , y]) => y)).toEqual([14, 14]);
});
