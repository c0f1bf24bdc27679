import { formatReading } from './format-angle';
import { formatFixed, withUnit } from './format-number';

/** Readings of one channel that are shown together. Pure. */

export interface ReadingRange {
  least: number;
  greatest: number;
}

/** Least and greatest of readings, in their unit; what is not finite does not count. Null where nothing else is there. */
export function rangeOf(values: ArrayLike<number>): ReadingRange | null {
  let [least, greatest] = [Infinity, -Infinity];
  for (let i = 0; i < values.length; i += 1) {
    const value = values[i] as number;
    if (!Number.isFinite(value)) continue;
    if (value < least) least = value;
    if (value > greatest) greatest = value;
  }
  return least <= greatest ? { least, greatest } : null;
}

const mostDecimals = 6;

/** Prints readings with as many decimals as tell the least from the greatest in two digits, six at most; four digits where all are the same. */
export function readingsWithin(unit: string, range: ReadingRange | null): (reading: number) => string {
  const span = range === null ? 0 : range.greatest - range.least;
  if (!(span > 0)) return (reading) => formatReading(reading, unit);
  const decimals = Math.min(mostDecimals, Math.max(0, 1 - Math.floor(Math.log10(span))));
  return (reading) => withUnit(formatFixed(reading, { decimals }), unit);
}
