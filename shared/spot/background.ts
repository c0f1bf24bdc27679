import { median, robustScale } from '../statistics/robust';

/** The straight line through the columns beside the spot: stray light that changes evenly over the picture is taken off by it. */
export interface Background {
  at(x: number): number;
  /** How much column `i` counts in the line's value at `x`; 0 for columns that were not used. */
  weight(i: number, x: number): number;
}

/** Least squares through the columns that `used` names. Null where fewer than `fewest` of them are used. */
export function backgroundOf(mean: Float64Array, used: (x: number) => boolean, fewest = 8): Background | null {
  const columns = [...mean.keys()].filter(used);
  if (columns.length < fewest) return null;
  const centre = columns.reduce((sum, x) => sum + x, 0) / columns.length;
  const level = columns.reduce((sum, x) => sum + (mean[x] as number), 0) / columns.length;
  let square = 0;
  let cross = 0;
  for (const x of columns) {
    square += (x - centre) ** 2;
    cross += (x - centre) * (mean[x] as number);
  }
  const slope = cross / square;
  return {
    at: (x) => level + slope * (x - centre),
    weight: (i, x) => (used(i) ? 1 / columns.length + ((x - centre) * (i - centre)) / square : 0),
  };
}

const ROUNDS = 8;

/**
 * The background before it is known where the spot is: what stands out above the line is left out, round by round. Right while the spot fills less
 * than half of the columns.
 */
export function roughBackground(mean: Float64Array): { line: Background; noise: number } {
  let kept = new Uint8Array(mean.length).fill(1);
  let noise = 0;
  for (let round = 0; ; round += 1) {
    const now = kept;
    const line = backgroundOf(mean, (x) => now[x] === 1, 2) as Background;
    const net = mean.map((value, x) => value - line.at(x));
    const ofKept = net.filter((_, x) => now[x] === 1);
    const middle = median(ofKept);
    noise = robustScale(ofKept.map((value) => value - middle));
    if (round === ROUNDS) return { line, noise };
    const next = Uint8Array.from(net, (value) => (value <= middle + 3 * noise ? 1 : 0));
    if (next.every((value, x) => value === now[x])) return { line, noise };
    kept = next;
  }
}
