import { boxAverage } from '@/shared/statistics/box-average';

const times = (fromS: number, toS: number, everyS: number) =>
  Array.from({ length: Math.round((toS - fromS) / everyS) }, (_, index) => fromS + index * everyS);
const boxesIn = ({ t }: { t: Float64Array }, fromS: number, toS: number) => t.filter((at) => at >= fromS && at < toS).length;
const line = (t: readonly number[]) => t.map((at) => 3 + 0.25 * at);

test('evenly spaced samples: every box holds as many of them, at their mean time', () => {
  const t = times(0, 100, 0.1);
  const boxes = boxAverage(t, line(t), 2);
  expect(boxes.t).toHaveLength(50);
  expect([...boxes.weight]).toEqual(Array.from({ length: 50 }, () => 20));
  expect(boxes.t[0]).toBeCloseTo(0.95, 12);
  // Root mean square of 20 equally spaced instants about their mean: interval · √((n² − 1)/12).
  expect(boxes.spreadS[0]).toBeCloseTo(0.1 * Math.sqrt((20 ** 2 - 1) / 12), 12);
});

test('a stretch with fewer samples a second than the rest is kept, where it holds a tenth of the samples but half of the time', () => {
  const t = [...times(0, 300, 0.1), ...times(300, 600, 1)];
  const boxes = boxAverage(t, line(t), 5);
  expect(boxes.samples).toBe(t.length);
  expect(boxesIn(boxes, 300, 600)).toBe(60);
  expect(boxesIn(boxes, 0, 300)).toBe(60);
  for (let k = 0; k < boxes.t.length; k += 1) expect(boxes.y[k]).toBeCloseTo(3 + 0.25 * (boxes.t[k] as number), 9);
});

test('a pause without samples makes no box and costs none beside it', () => {
  const t = [...times(0, 200, 0.1), ...times(260, 400, 0.1)];
  const boxes = boxAverage(t, line(t), 5);
  expect(boxesIn(boxes, 200, 260)).toBe(0);
  expect(boxes.t).toHaveLength(68);
  expect(new Set(boxes.weight)).toEqual(new Set([50]));
});
