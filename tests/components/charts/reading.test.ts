import { readingAt } from '@/components/charts/reading';

/** mulberry32: seeded, so that the scatter is the same in every run. */
function normals(seed: number): () => number {
  let a = seed;
  const uniform = () => {
    a = (a + 0x6d2b79f5) | 0;
    let t = Math.imul(a ^ (a >>> 15), 1 | a);
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t;
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
  };
  return () => Math.sqrt(-2 * Math.log(1 - uniform())) * Math.cos(2 * Math.PI * uniform());
}

const seconds = Array.from({ length: 400 }, (_, i) => i * 1000);

test('the u that stands beside a reading is the scatter of single readings, whatever smooth course they follow', () => {
  const sigma = 0.018;
  const draw = normals(20310214);
  const series = { x: seconds, y: seconds.map((ms) => 5 * Math.sin((2 * Math.PI * ms) / 420_000) + 20 + sigma * draw()) };
  const us = seconds
    .slice(20, -20)
    .flatMap((x) => readingAt(series, x, { thinned: false }) ?? [])
    .map((reading) => (reading.kind === 'value' ? (reading.u ?? NaN) : NaN));
  expect(us).toHaveLength(360);
  const rms = Math.sqrt(us.reduce((sum, u) => sum + u * u, 0) / us.length);
  // 360 windows that overlap are about 20 that do not, of 17 differences each: the rms is known to some 8 %.
  expect(rms / sigma).toBeGreaterThan(0.8);
  expect(rms / sigma).toBeLessThan(1.2);
});

test('between two readings it is on the straight line, in a gap and outside there is none', () => {
  const series = { x: [0, 1000, 2000, 60_000, 61_000, 62_000], y: [1, 2, 3, 9, 9, 9] };
  expect(readingAt(series, 1500, { thinned: false })).toMatchObject({ kind: 'value', value: 2.5 });
  expect(readingAt(series, 30_000, { thinned: false, gapMs: 5000 })).toBeNull();
  expect(readingAt(series, -1, { thinned: false })).toBeNull();
});

test('where too few readings stand close by, or none differs from another, no u is claimed', () => {
  expect(readingAt({ x: [0, 1, 2], y: [1, 2, 1] }, 1, { thinned: false })).toEqual({ kind: 'value', value: 2, u: null });
  expect(readingAt({ x: seconds, y: seconds.map(() => 19.5) }, 50_000, { thinned: false })).toEqual({
    kind: 'value',
    value: 19.5,
    u: null,
  });
});

test('of a thinned series the least and greatest about the cursor are told', () => {
  const series = { x: [0, 10, 100, 110, 200, 210], y: [1, 3, -4, 5, 0, 2] };
  expect(readingAt(series, 105, { thinned: true, gapMs: 1000 })).toEqual({ kind: 'range', least: -4, greatest: 5 });
});
