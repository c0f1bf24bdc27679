import { axisPx, colours, drawRig, pictureSize } from '@/server/ingest/drawn-camera';
import type { SeenRig } from '@/server/interfaces/rig-stations';
import { pictureTypeOf } from '@/shared/camera/picture';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import { readPng, type Pixels } from '@/tests/support/read-png';

const evening = Date.parse('2031-02-14T20:15:42.900Z');
const seen = (change: Partial<SeenRig> = {}): SeenRig => ({ rig: demoRigWide, angleDeg: 20.18, doorClosed: true, ...change });
const draw = (change: Partial<SeenRig> = {}) => readPng(drawRig(seen(change), evening));

const isNear = (pixel: readonly number[], colour: readonly number[]) =>
  pixel.every((value, of) => Math.abs(value - (colour[of] ?? 0)) <= 2);
function placesOf(pixels: Pixels, colour: readonly number[]): { x: number; y: number }[] {
  const found: { x: number; y: number }[] = [];
  for (let y = 0; y < pixels.height; y += 1)
    for (let x = 0; x < pixels.width; x += 1) if (isNear(pixels.at(x, y), colour)) found.push({ x, y });
  return found;
}
const middleOf = (places: readonly { x: number; y: number }[]) => ({
  x: places.reduce((sum, { x }) => sum + x, 0) / places.length + 0.5,
  y: places.reduce((sum, { y }) => sum + y, 0) / places.length + 0.5,
});
/** Counter-clockwise from the arm at rest, which points to the right; rows of a picture go down. */
const readDeg = (pixels: Pixels) => {
  const { x, y } = middleOf(placesOf(pixels, colours.mark));
  return (Math.atan2(axisPx.y - y, x - axisPx.x) * 180) / Math.PI;
};

test.each([0, 20.18, -20.18, 90, 133.7, -159.82, 175])('the turntable at %d° is read back out of the picture', (angleDeg) => {
  const away = Math.abs(((readDeg(draw({ angleDeg })) - angleDeg + 540) % 360) - 180);
  // A tenth of a pixel at the mass, which stands some 97 px from the axis, is 0.06°; the pixels of the mark leave a few of them.
  expect(away).toBeLessThan(0.4);
});

test('the masses stand as far from the axis as their orbit says, beside the arm as long as it is', () => {
  for (const rig of [demoRigWide, demoRigNarrow]) {
    const pixels = draw({ rig, angleDeg: 90 });
    const mark = middleOf(placesOf(pixels, colours.mark));
    const orbitPx = Math.hypot(mark.x - axisPx.x, mark.y - axisPx.y);
    const arm = placesOf(pixels, colours.arm).filter(({ y }) => Math.abs(y - axisPx.y) < 1);
    const reachPx = Math.max(...arm.map(({ x }) => x)) + 1 - axisPx.x;
    const { arm: armM, ballRadius } = rig.pendulum;
    expect(reachPx / orbitPx).toBeCloseTo((armM.value + ballRadius.value) / (rig.sources.orbit?.value ?? 0), 1);
  }
});

test('without masses only the bar that would carry them turns', () => {
  const empty = draw({ rig: { ...demoRigWide, sources: { shape: 'none' } } });
  // Where the arm's edge is softened a pixel or two come out in that grey.
  expect(placesOf(empty, colours.mass).length).toBeLessThan(20);
  expect(placesOf(draw(), colours.mass).length).toBeGreaterThan(500);
  expect(readDeg(empty)).toBeCloseTo(20.18, 0);
});

test('light falls through the door when it is open and only then', () => {
  expect(placesOf(draw(), colours.light)).toEqual([]);
  expect(placesOf(draw({ doorClosed: false }), colours.light).length).toBeGreaterThan(1000);
});

test('it is a whole PNG of its size and says when it was drawn', () => {
  const bytes = drawRig(seen(), evening);
  expect(pictureTypeOf(bytes)).toBe('image/png');
  const pixels = readPng(bytes);
  expect([pixels.width, pixels.height]).toEqual([pictureSize.width, pictureSize.height]);
  const said = (picture: Pixels) => placesOf(picture, colours.text);
  const second = said(readPng(drawRig(seen(), evening + 1000)));
  const changed = said(pixels).filter(({ x, y }) => !second.some((each) => each.x === x && each.y === y));
  // 20:15:42Z and 20:15:43Z differ in the eighth letter, of eight pixels each, and nowhere else.
  expect(said(pixels).length).toBeGreaterThan(200);
  expect(changed.length).toBeGreaterThan(0);
  expect(new Set(changed.map(({ x }) => Math.floor((x - 12) / 8)))).toEqual(new Set([7]));
  expect(bytes.length).toBeLessThan(20_000);
});
