import type { ReadingRange } from '@/shared/lib/reading-range';
import type { Series } from './curve';

interface SparkFrame {
  /** Of the series. */
  range: ReadingRange;
  /** UTC ms at the left and at the right edge. */
  fromUtcMs: number;
  toUtcMs: number;
  gapMs: number;
  widthPx: number;
  heightPx: number;
}

/** The line as an SVG path, px; a channel that stays the same runs through the middle. */
export function sparkPath({ x, y }: Series, { range, fromUtcMs, toUtcMs, gapMs, widthPx, heightPx }: SparkFrame): string {
  const { least, greatest } = range;
  const edge = 2;
  const across = (at: number) => (widthPx * (at - fromUtcMs)) / Math.max(1, toUtcMs - fromUtcMs);
  const up = (value: number) =>
    greatest === least ? heightPx / 2 : heightPx - edge - ((heightPx - 2 * edge) * (value - least)) / (greatest - least);
  let path = '';
  let last = -Infinity;
  for (let i = 0; i < x.length; i += 1) {
    const [at, value] = [x[i] as number, y[i] as number];
    if (!Number.isFinite(value)) continue;
    path += `${at - last > gapMs ? 'M' : 'L'}${across(at).toFixed(1)} ${up(value).toFixed(1)}`;
    last = at;
  }
  return path;
}
