/** Means over boxes of equal numbers of samples, with the number of samples in each. */
export interface BoxAverages {
  /** Mean time of each box, in the unit of the times given. */
  t: Float64Array;
  y: Float64Array;
  weight: Float64Array;
  /** Root mean square distance of a box's samples from their mean time, in the unit of `t`. */
  spreadS: Float64Array;
  /** Samples that went into a box. */
  samples: number;
}

/** A pause of this many usual intervals ends a run of samples. */
const gapFactor = 3;

/**
 * Averages samples over boxes of about `width` (unit of `t`). Averaging n equally spaced samples leaves the damped
 * oscillation of the dwell model exact: offset and slope stay and the amplitude is multiplied by one complex number, as long as n is the
 * same in all boxes. So every box holds the same number of consecutive samples, and the few left over at the ends of a run are
 * dropped, half at either end. Series with so many gaps that this would cost over a fifth of the samples, or a twentieth of the time, are cut by
 * time instead: a stretch with fewer samples a second than the rest must not be lost.
 */
export function boxAverage(t: ArrayLike<number>, y: ArrayLike<number>, width: number): BoxAverages {
  const interval = medianInterval(t);
  const size = interval > 0 ? Math.max(1, Math.floor(width / interval + 1e-6)) : 1;
  const equal = equalBoxes(t, size, gapFactor * interval);
  const kept = equal.reduce((sum, [from, to]) => sum + to - from, 0);
  if (size === 1) return collect(t, y, equal);
  const byTime = timeBoxes(t, width);
  const isWhole = kept >= 0.8 * t.length && untouched(byTime, equal) <= 0.05 * byTime.length;
  return collect(t, y, isWhole ? equal : byTime);
}

export function medianInterval(t: ArrayLike<number>): number {
  if (t.length < 2) return 0;
  const stride = Math.max(1, Math.floor((t.length - 1) / 2000));
  const intervals: number[] = [];
  for (let i = 1; i < t.length; i += stride) intervals.push((t[i] as number) - (t[i - 1] as number));
  intervals.sort((a, b) => a - b);
  return intervals[intervals.length >> 1] as number;
}

type Box = [from: number, to: number];

function equalBoxes(t: ArrayLike<number>, size: number, gap: number): Box[] {
  const boxes: Box[] = [];
  let start = 0;
  for (let i = 1; i <= t.length; i += 1) {
    if (i < t.length && !((t[i] as number) - (t[i - 1] as number) > gap)) continue;
    const left = (i - start) % size;
    for (let from = start + (left >> 1); from + size <= i; from += size) boxes.push([from, from + size]);
    start = i;
  }
  return boxes;
}

function timeBoxes(t: ArrayLike<number>, width: number): Box[] {
  const boxes: Box[] = [];
  let from = 0;
  for (let i = 1; i <= t.length; i += 1) {
    if (i < t.length && Math.floor((t[i] as number) / width) === Math.floor((t[from] as number) / width)) continue;
    boxes.push([from, i]);
    from = i;
  }
  return boxes;
}

/** How many boxes by time, but for the first and the last one, hold no sample of the others. Both are in the order of time. */
function untouched(byTime: readonly Box[], others: readonly Box[]): number {
  let next = 0;
  return byTime.slice(1, -1).filter(([from, to]) => {
    while (next < others.length && (others[next] as Box)[1] <= from) next += 1;
    return next === others.length || (others[next] as Box)[0] >= to;
  }).length;
}

function collect(t: ArrayLike<number>, y: ArrayLike<number>, boxes: readonly Box[]): BoxAverages {
  const result = {
    t: new Float64Array(boxes.length),
    y: new Float64Array(boxes.length),
    weight: new Float64Array(boxes.length),
    spreadS: new Float64Array(boxes.length),
    samples: 0,
  };
  boxes.forEach(([from, to], k) => {
    const [t0, y0] = [t[from] as number, y[from] as number];
    let [time, square, value] = [0, 0, 0];
    for (let i = from; i < to; i += 1) {
      const since = (t[i] as number) - t0;
      time += since;
      square += since * since;
      value += (y[i] as number) - y0;
    }
    const count = to - from;
    result.t[k] = t0 + time / count;
    result.y[k] = y0 + value / count;
    result.weight[k] = count;
    result.spreadS[k] = Math.sqrt(Math.max(0, square / count - (time / count) ** 2));
    result.samples += count;
  });
  return result;
}
