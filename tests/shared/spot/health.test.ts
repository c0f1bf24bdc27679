import { figuresOf, healthAfter, meanPxOf, noFrames, type SeenFrame, type SpotHealth } from '@/shared/spot/health';
import { regionBetween, regionFault } from '@/shared/spot/setting';
import { warningsOf, type WarningFacts } from '@/shared/spot/warnings';
import { seeded } from '../../support/drawn-spot';

const spot = (px: number, uPx = 0.02): SeenFrame['reading'] => ({ kind: 'spot', px, uPx, widthPx: 12, second: false });
const frame = (i: number, reading: SeenFrame['reading'], over: Partial<SeenFrame> = {}): SeenFrame => ({
  capturedMs: i * 40,
  missed: 0,
  reading,
  saturated: 0,
  brightest: 160,
  ...over,
});
const seen = (frames: SeenFrame[], from: SpotHealth = noFrames) => frames.reduce(healthAfter, from);

test('rate, missed pictures and noise of a spot that moves steadily', () => {
  const deviate = seeded(11);
  // 25 pictures a second, moving 3 px a second, scattered by 0.05 px.
  const frames = Array.from({ length: 400 }, (_, i) =>
    // A knock now and then is no noise.
    frame(i, spot(100 + i * 0.12 + 0.05 * deviate() + (i % 60 === 30 ? 8 : 0)), { missed: i % 100 === 50 ? 2 : 0 }),
  );
  const noise: number[] = [];
  let health = noFrames;
  for (const one of frames) {
    health = healthAfter(health, one);
    noise.push(figuresOf(health, one.capturedMs).noisePx ?? 0.05);
  }
  expect(health).toMatchObject({ frames: 400, missed: 8, unread: 0 });
  expect(figuresOf(health, 399 * 40).rateHz).toBeCloseTo(25, 6);
  expect(figuresOf(health, 399 * 40).uPx).toBeCloseTo(0.02, 6);
  expect(noise.reduce((sum, value) => sum + value / noise.length, 0)).toBeCloseTo(0.05, 2);
  expect(figuresOf(health, 399 * 40 + 2500).rateHz).toBe(0);
});

test('a mark takes the mean of the last pictures, and none where the last one showed no spot', () => {
  const health = seen([frame(0, spot(10)), frame(1, spot(12))]);
  expect(meanPxOf(health)).toBe(11);
  expect(meanPxOf(healthAfter(health, frame(2, { kind: 'none', why: 'dark' })))).toBeNull();
});

const quiet = seen(Array.from({ length: 64 }, (_, i) => frame(i, spot(100))));
const facts = (over: Partial<WarningFacts> = {}): WarningFacts => {
  const health = over.health ?? quiet;
  return {
    health,
    figures: figuresOf(health, health.recent.at(-1)?.capturedMs ?? 0),
    device: { awake: true, battery: { level: 1, charging: true }, hidden: false },
    stamped: 'capture',
    clockUMs: 4,
    clockErrorMs: 80,
    ...over,
  };
};

test('nothing is said while all is well', () => expect(warningsOf(facts())).toEqual([]));

test.each<[string, Partial<WarningFacts>, RegExp]>([
  ['saturation', { health: healthAfter(quiet, frame(64, spot(100), { saturated: 40 })) }, /^40 pixels are saturated.*Shorten the exposure/],
  ['no spot', { health: healthAfter(quiet, frame(64, { kind: 'none', why: 'at-border' })) }, /cut off by the end of the region/],
  ['noise that the pixels do not explain', { figures: { rateHz: 25, noisePx: 0.2, uPx: 0.02 } }, /scatters by 0\.20 px, 10 times/],
  ['a rate that falls', { figures: { rateHz: 7, noisePx: null, uPx: null } }, /fallen to 7\.0 of 25 pictures a second/],
  ['silence', { figures: { rateHz: 0, noisePx: null, uPx: null } }, /No picture has come for 2 s/],
  ['missed pictures', { health: { ...quiet, missed: 16 } }, /20.% of the pictures were missed/],
  ['stamps that come late', { stamped: 'shown' }, /bear the moment it was shown/],
  ['a server not heard', { clockUMs: null, clockErrorMs: null }, /time of the server is not known yet/],
  ['a bad clock', { clockUMs: 120 }, /known to 120.ms only/],
  ['a device whose clock is wrong', { clockErrorMs: -90_000 }, /clock of this device is .* behind the server's/],
  ['a page out of sight', { device: { awake: true, battery: null, hidden: true } }, /This page is not seen/],
  ['sleep', { device: { awake: null, battery: null, hidden: false } }, /cannot keep the device awake/],
  [
    'a low battery',
    { device: { awake: true, battery: { level: 0.22, charging: false }, hidden: false } },
    /22.% left: it will not last the night/,
  ],
])('%s is said', (_, over, words) => {
  const said = warningsOf(facts(over));
  expect(said).toHaveLength(1);
  expect(said[0]).toMatch(words);
});

test('a region is drawn between any two corners, within the picture, and must be large enough', () => {
  const picture = { width: 320, height: 240 };
  const region = regionBetween({ x: 400, y: 100.4 }, { x: 99.6, y: -5 }, picture);
  expect(region).toEqual({ left: 100, top: 0, width: 220, height: 100 });
  expect(regionFault(region, picture)).toBeNull();
  expect(regionFault({ ...region, width: 20 }, picture)).toMatch(/20 × 100 px; at least 32 × 4/);
  expect(regionFault({ ...region, top: 200 }, picture)).toMatch(/ends at column 320 and row 300.*320 × 240/);
});
