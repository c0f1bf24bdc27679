import { intensitiesOf } from '@/shared/spot/intensities';
import { readSpot, type ReadingOf } from '@/shared/spot/read-spot';
import { drawSpot, seeded, usualSpot, type DrawnSpot } from '../../support/drawn-spot';

/** Spots whose place is known: error and stated u of what is read. */

const rms = (values: number[]) => Math.sqrt(values.reduce((sum, value) => sum + value * value, 0) / values.length);
const mean = (values: number[]) => values.reduce((sum, value) => sum + value, 0) / values.length;

interface Told {
  error: number;
  u: number;
}

/** Reads `count` pictures of spots at places all over the columns and between them. */
function errorsOf(spot: DrawnSpot, { of = 'centre' as ReadingOf, count = 60, at = 0 } = {}): Told[] {
  const deviate = seeded(7);
  return Array.from({ length: count }, (_, i) => {
    const x = 48 + ((i * 37) % 64) + ((i * 0.618) % 1);
    const reading = readSpot(drawSpot({ ...spot, x }, deviate), of);
    if (reading.kind !== 'spot') throw new Error(`${reading.why} at ${x}`);
    return { error: reading.px - x - at, u: reading.uPx };
  });
}

test.each([
  ['a spot in uneven light', usualSpot],
  ['a dim one', { ...usualSpot, height255: 70 }],
  ['a narrow one', { ...usualSpot, sigmaX: 2.5, sigmaY: 3 }],
  ['a slit', { ...usualSpot, sigmaX: 4, sigmaY: 40 }],
  ['steep light from the side', { ...usualSpot, background: { level: 20, perColumn: 0.3, perRow: 0.4 } }],
])('the centroid of %s is right to 0.05 px rms, and its u is that error', (_, spot) => {
  const told = errorsOf(spot);
  expect(rms(told.map(({ error }) => error))).toBeLessThan(0.05);
  expect(Math.abs(mean(told.map(({ error }) => error)))).toBeLessThan(0.012);
  const pull = rms(told.map(({ error, u }) => error / u));
  expect(pull).toBeGreaterThan(0.75);
  expect(pull).toBeLessThan(1.3);
});

test('a spot whose top is cut off by the camera is still read, and the saturated pixels are counted', () => {
  const bright = { ...usualSpot, height255: 400 };
  expect(drawSpot(bright, seeded(1)).saturated).toBeGreaterThan(50);
  expect(rms(errorsOf(bright).map(({ error }) => error))).toBeLessThan(0.05);
});

test.each([
  ['left', -1],
  ['right', 1],
] as const)('the %s edge lies where the flank passes half of its height', (of, side) => {
  // A Gaussian falls to half at √(2 ln 2) standard deviations.
  const at = side * Math.sqrt(2 * Math.LN2) * usualSpot.sigmaX;
  const told = errorsOf(usualSpot, { of, at });
  // The line through five columns, and the mean of the five about the top, differ from the curve by the same amount everywhere.
  const shift = mean(told.map(({ error }) => error));
  expect(Math.abs(shift)).toBeLessThan(0.25);
  const scatter = told.map(({ error, u }) => ({ error: error - shift, u }));
  expect(rms(scatter.map(({ error }) => error))).toBeLessThan(0.05);
  const pull = rms(scatter.map(({ error, u }) => error / u));
  expect(pull).toBeGreaterThan(0.75);
  expect(pull).toBeLessThan(1.3);
});

test('the same picture turned round is read at the mirrored column', () => {
  const picture = drawSpot({ ...usualSpot, x: 81.3 }, seeded(3));
  const { width } = picture;
  const turned = picture.values.map((_, i) => picture.values[i - (i % width) + (width - 1 - (i % width))] as number);
  const [one, other] = [readSpot(picture, 'centre'), readSpot({ ...picture, values: turned }, 'centre')];
  expect(one.kind === 'spot' && other.kind === 'spot' ? one.px + other.px : null).toBeCloseTo(width - 1, 3);
});

test('where no position can be told the reason is', () => {
  const dark = drawSpot({ ...usualSpot, height255: 0 }, seeded(5));
  expect(readSpot(dark, 'centre')).toEqual({ kind: 'none', why: 'dark' });
  expect(readSpot({ ...dark, values: dark.values.map(() => 0) }, 'centre')).toEqual({ kind: 'none', why: 'dark' });
  for (const x of [0, 8, 151, 159])
    expect(readSpot(drawSpot({ ...usualSpot, x }, seeded(5)), 'centre')).toEqual({ kind: 'none', why: 'at-border' });
  expect(readSpot(drawSpot({ ...usualSpot, x: 1 }, seeded(5)), 'left')).toMatchObject({ kind: 'none' });
  const wide = drawSpot({ ...usualSpot, width: 64, x: 32, sigmaX: 7 }, seeded(5));
  expect(readSpot(wide, 'centre')).toMatchObject({ kind: 'none' });
});

test('a second light in the region is told', () => {
  const one = drawSpot({ ...usualSpot, x: 60 }, seeded(2));
  const two = drawSpot({ ...usualSpot, x: 125, height255: 90, background: { level: 0, perColumn: 0, perRow: 0 } }, seeded(4));
  const both = { ...one, values: one.values.map((value, i) => value + (two.values[i] as number)) };
  expect(readSpot(one, 'centre')).toMatchObject({ second: false });
  expect(readSpot(both, 'centre')).toMatchObject({ kind: 'spot', second: true });
});

test('white light is the mean of the colours, one colour is itself, and a full pixel counts as saturated', () => {
  const rgba = [30, 60, 90, 255, 255, 3, 0, 255];
  const size = { width: 2, height: 1 };
  expect(intensitiesOf(rgba, size, 'all')).toEqual({ ...size, values: Float64Array.of(60, 86), saturated: 1, brightest: 86 });
  expect(intensitiesOf(rgba, size, 'green')).toEqual({ ...size, values: Float64Array.of(60, 3), saturated: 0, brightest: 60 });
});
