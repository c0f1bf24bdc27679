import { backgroundOf, roughBackground, type Background } from './background';
import type { Intensities } from './intensities';
import { profileOf, smoothed, varianceOf, type Profile } from './profile';

/** What of the spot is read: the centroid of its light, or where a flank passes half of its height. */
export type ReadingOf = 'centre' | 'left' | 'right';

export type SpotReading =
  | {
      kind: 'spot';
      /** From the centre of the leftmost column of the region, px. */
      px: number;
      /** Standard uncertainty from the noise of this picture, px. */
      uPx: number;
      /** Full width at half height, px. */
      widthPx: number;
      /** Something else in the region is nearly as bright. */
      second: boolean;
    }
  | {
      kind: 'none';
      /** `dark`: nothing stands out of the noise; `at-border`: cut off by the region; `too-wide`: no background is left beside it. */
      why: 'dark' | 'at-border' | 'too-wide';
    };

/** Height above the background, in its standard deviations, from which something is a spot; and the least height at all, of 255. */
const LEAST_SIGNAL = { deviations: 5, level: 0.2 };
/** Half of the window in standard deviations of a Gaussian spot of this width: what lies beyond shifts the centroid by less than 1e-3 px. */
const HALF_WINDOW = 4;
/** Half of the rows that are summed up, likewise. */
const HALF_HEIGHT = 2.5;
/** Full width at half height of a Gaussian in its standard deviations, 2 √(2 ln 2). */
const WIDTH_OF_SIGMA = 2.354820045;
/** Fewest columns of a region in which a spot can be found at all. */
export const FEWEST_COLUMNS = 32;
export const FEWEST_ROWS = 4;
/** A second light of this share of the spot's height is told. */
const SECOND_SHARE = 0.3;

const none = (why: 'dark' | 'at-border' | 'too-wide'): SpotReading => ({ kind: 'none', why });

/** Where the spot is to within a pixel, and how wide. */
interface Rough {
  peak: number;
  left: number;
  right: number;
  sigma: number;
}

/**
 * Position of the one light spot in a region, along the rows. The region must have at least `FEWEST_COLUMNS` × `FEWEST_ROWS` pixels.
 * The u covers the noise of the pixels as far as neighbours are independent; whatever moves the whole spot is no part of it.
 */
export function readSpot(picture: Intensities, of: ReadingOf): SpotReading {
  const rough = roughSpot(profileOf(picture, { from: 0, to: picture.height }).mean);
  if (typeof rough === 'string') return none(rough);
  const profile = profileOf(picture, rowsOfSpot(picture, rough));
  const half = Math.max(3, Math.ceil(HALF_WINDOW * rough.sigma));
  return of === 'centre' ? centroid(profile, rough, half) : edge(profile, { ...rough, side: of }, half);
}

function roughSpot(mean: Float64Array): Rough | 'dark' | 'at-border' {
  const { line, noise } = roughBackground(mean);
  const net = smoothed(mean.map((value, x) => value - line.at(x)));
  const width = widthAt(net);
  if (width.level < Math.max(LEAST_SIGNAL.deviations * noise, LEAST_SIGNAL.level)) return 'dark';
  if (width.left < 0 || width.right >= mean.length) return 'at-border';
  return { ...width, sigma: Math.max(1, (width.right - width.left) / WIDTH_OF_SIGMA) };
}

/** The highest place, and where it falls to half on either side: −1 or the length where it does not. */
function widthAt(net: Float64Array): { peak: number; level: number; left: number; right: number } {
  const peak = net.reduce((best, value, x) => (value > (net[best] as number) ? x : best), 0);
  const level = net[peak] as number;
  let left = peak;
  while (left >= 0 && (net[left] as number) >= level / 2) left -= 1;
  let right = peak;
  while (right < net.length && (net[right] as number) >= level / 2) right += 1;
  return { peak, level, left, right };
}

/** The rows that the spot shines on: the others would only add noise. */
function rowsOfSpot({ width, height, values }: Intensities, rough: Rough): { from: number; to: number } {
  const bright = Float64Array.from({ length: height }, (_, y) => {
    let sum = 0;
    for (let x = rough.left + 1; x < rough.right; x += 1) sum += values[y * width + x] as number;
    return sum;
  });
  const soft = smoothed(bright);
  const least = soft.reduce((lowest, value) => Math.min(lowest, value), Infinity);
  const { left, right } = widthAt(soft.map((value) => value - least));
  const sigma = (right - left) / WIDTH_OF_SIGMA;
  const middle = (left + right) / 2;
  const reach = HALF_HEIGHT * sigma + 1;
  const from = Math.max(0, Math.floor(middle - reach));
  return { from, to: Math.max(Math.min(height, Math.ceil(middle + reach) + 1), from + 1) };
}

const outside =
  ({ from, to }: Window) =>
  (x: number) =>
    x < from - 1 || x > to + 1;

interface Window {
  from: number;
  to: number;
}

/**
 * The place about which the light is balanced, each column counting by a Gaussian about that place: Σ (x − c) w(x − c) net(x) = 0. The plain
 * centroid would count the noise far from the spot most. For a spot that is symmetric both are its middle.
 */
function centroid(profile: Profile, rough: Rough, half: number): SpotReading {
  const { mean } = profile;
  const middle = Math.round((rough.left + rough.right) / 2);
  const window = { from: middle - half, to: middle + half };
  if (window.from < 0 || window.to >= mean.length) return none('at-border');
  const line = backgroundOf(mean, outside(window));
  if (line === null) return none('too-wide');
  const sigma = WEIGHT_SIGMA * rough.sigma;
  let px = middle;
  for (let round = 0; round < MOST_ROUNDS; round += 1) {
    const { balance, slope } = balanceAt(px, { mean, window, line, sigma });
    const step = balance / slope;
    if (!(slope > 0) || !(Math.abs(px + step - middle) <= half)) return none('dark');
    px += step;
    if (Math.abs(step) > CLOSE_PX) continue;
    return {
      kind: 'spot',
      px,
      uPx: Math.sqrt(varianceOf(profile, centroidWeights(px, { mean, window, line, sigma }))),
      widthPx: rough.right - rough.left,
      second: hasSecond(mean, { window, line, level: (mean[rough.peak] as number) - line.at(rough.peak) }),
    };
  }
  return none('dark');
}

/** Width of the weights in standard deviations of the spot; least noise at 1, less sensitive to the width at more. */
const WEIGHT_SIGMA = 1.2;
const CLOSE_PX = 1e-6;
const MOST_ROUNDS = 30;

interface Balanced {
  mean: Float64Array;
  window: Window;
  line: Background;
  sigma: number;
}

const weightAt = (distance: number, sigma: number) => Math.exp(-0.5 * (distance / sigma) ** 2);

/** How far the light is out of balance about a place, and how fast that falls when the place moves. */
function balanceAt(px: number, { mean, window, line, sigma }: Balanced): { balance: number; slope: number } {
  let balance = 0;
  let slope = 0;
  for (let x = window.from; x <= window.to; x += 1) {
    const d = x - px;
    const light = weightAt(d, sigma) * ((mean[x] as number) - line.at(x));
    balance += d * light;
    slope += light * (1 - (d / sigma) ** 2);
  }
  return { balance, slope };
}

/** How much the place moves with each column: those of the window directly, the others by the background they carry. */
function centroidWeights(px: number, at: Balanced): Float64Array {
  const { mean, window, line, sigma } = at;
  const { slope } = balanceAt(px, at);
  const beside = outside(window);
  // The background is a straight line: its weights at two places are enough.
  let zeroth = 0;
  let first = 0;
  for (let x = window.from; x <= window.to; x += 1) {
    const part = (x - px) * weightAt(x - px, sigma);
    zeroth += part;
    first += part * x;
  }
  return Float64Array.from({ length: mean.length }, (_, i) => {
    const own = i >= window.from && i <= window.to ? (i - px) * weightAt(i - px, sigma) : 0;
    if (!beside(i)) return own / slope;
    const at0 = line.weight(i, 0);
    return (own - zeroth * at0 - first * (line.weight(i, 1) - at0)) / slope;
  });
}

function hasSecond(mean: Float64Array, { window, line, level }: { window: Window; line: Background; level: number }): boolean {
  const beside = outside(window);
  return smoothed(mean.map((value, x) => (beside(x) ? value - line.at(x) : 0))).some((value) => value > SECOND_SHARE * level);
}

/** Half of the columns of a flank through which a straight line is laid. */
const FLANK = 2;

function edge(profile: Profile, rough: Rough & { side: 'left' | 'right' }, half: number): SpotReading {
  const { mean } = profile;
  const middle = Math.round((rough.left + rough.right) / 2);
  const window = { from: Math.max(0, middle - half), to: Math.min(mean.length - 1, middle + half) };
  const line = backgroundOf(mean, outside(window));
  if (line === null) return none('too-wide');
  const top = columnsAbout(rough.peak);
  const height = top.reduce((sum, x) => sum + ((mean[x] ?? 0) - line.at(x)) / top.length, 0);
  let at = rough.side === 'left' ? rough.left : rough.right;
  let found: { px: number; slope: number } | null = null;
  for (let round = 0; round < 4; round += 1) {
    if (at < FLANK || at >= mean.length - FLANK) return none('at-border');
    const flank = flankAt(mean, at, line);
    found = { px: at + (height / 2 - flank.level) / flank.slope, slope: flank.slope };
    if (!(Math.abs(found.px - at) < half)) return none('dark');
    if (Math.round(found.px) === at) break;
    at = Math.round(found.px);
  }
  if (found === null || found.slope > 0 !== (rough.side === 'left')) return none('dark');
  const { px, slope } = found;
  const peak = rough.peak;
  const weights = Float64Array.from({ length: mean.length }, (_, i) => {
    const own = Math.abs(i - at) <= FLANK ? 1 / (2 * FLANK + 1) + ((px - at) * (i - at)) / SQUARES : 0;
    const ofTop = Math.abs(i - peak) <= FLANK ? 1 / (2 * FLANK + 1) : 0;
    return (own - ofTop / 2 - line.weight(i, px) + line.weight(i, peak) / 2) / slope;
  });
  return {
    kind: 'spot',
    px,
    uPx: Math.sqrt(varianceOf(profile, weights)),
    widthPx: rough.right - rough.left,
    second: hasSecond(mean, { window, line, level: height }),
  };
}

/** Σ i² over a flank. */
const SQUARES = 10;

const columnsAbout = (x: number) => Array.from({ length: 2 * FLANK + 1 }, (_, i) => x - FLANK + i);

/** Height and slope of the straight line through the flank about a column. */
function flankAt(mean: Float64Array, at: number, line: Background): { level: number; slope: number } {
  let level = 0;
  let slope = 0;
  for (const x of columnsAbout(at)) {
    const net = (mean[x] as number) - line.at(x);
    level += net / (2 * FLANK + 1);
    slope += (net * (x - at)) / SQUARES;
  }
  return { level, slope };
}
