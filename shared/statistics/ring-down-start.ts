import { boxAverage } from './box-average';
import { ringDownSegment, type RingDownData } from './ring-down';
import { robustScale } from './robust';
import { fitSeparable, residualSumAt, type SeparableSegment } from './variable-projection';

/** A sum of squares of a single damped sine has many valleys, so a fit must start in the right one. */
export interface RingDownStart {
  /** rad/s */
  omega: number;
  /** 1/s */
  gamma: number;
}

const segmentLimit = 5;
const datumLimit = 160;
const dampings = [0.005, 0.05, 0.2];
const valleys = 6;

/**
 * Start values for ω and γ: the residual sum of squares is scanned over frequency and a few dampings on the segments with
 * the greatest scatter, the best valleys are descended, and the lowest wins, by what it leaves of the undisturbed data. A hint (from a measured period, say) is one more candidate.
 * Null when no valley can be descended.
 */
export function ringDownStart(data: readonly RingDownData[], hint: RingDownStart | null): RingDownStart | null {
  const segments = scanSegments(data);
  if (segments.length === 0) return null;
  const candidates = scan(
    segments.map(({ segment }) => segment),
    frequencies(segments.map(({ spanS, stepS }) => ({ spanS, stepS }))),
  );
  if (hint !== null) candidates.push({ ...hint, ssr: NaN });
  // Faster waves look like slow ones in data that are so far apart.
  const fastest = Math.max(hint?.omega ?? 0, Math.PI / Math.max(...segments.map(({ stepS }) => stepS)));
  const found = candidates.flatMap(({ omega, gamma }) => {
    const one = descend(
      segments.map(({ segment }) => segment),
      { omega, gamma },
      fastest,
    );
    return one === null ? [] : [one];
  });
  return lowest(found);
}

/** Residuals beyond this many scales count no more than at it: a disturbance is not to decide. */
const cutOff = 3;

/**
 * The lowest valley. A disturbance can be followed closely by a fast wave that dies at once; it leaves most of the data unexplained, so the
 * valleys are compared by residuals cut off at three times the scale that the best of them leaves.
 */
function lowest(found: readonly Descended[]): RingDownStart | null {
  const scale = Math.min(...found.map(({ residuals }) => robustScale(residuals)));
  const cost = ({ residuals, ssr }: Descended) =>
    scale > 0 ? residuals.reduce((sum, value) => sum + Math.min(value * value, (cutOff * scale) ** 2), 0) : ssr;
  const ranked = found.map((one) => ({ one, cost: cost(one) })).sort((a, b) => a.cost - b.cost || a.one.ssr - b.one.ssr);
  const best = ranked[0]?.one;
  return best === undefined ? null : { omega: best.omega, gamma: best.gamma };
}

interface Descended extends RingDownStart {
  ssr: number;
  residuals: Float64Array;
}

interface ScanSegment {
  segment: SeparableSegment;
  spanS: number;
  stepS: number;
}

function scanSegments(data: readonly RingDownData[]): ScanSegment[] {
  return data
    .map((one) => ({ one, scatter: scatterOf(one.y) }))
    .sort((a, b) => b.scatter - a.scatter)
    .slice(0, segmentLimit)
    .flatMap(({ one }) => {
      const n = one.tS.length;
      const spanS = (one.tS[n - 1] ?? 0) - (one.tS[0] ?? 0);
      const { t, y } = n > datumLimit ? boxAverage(one.tS, one.y, spanS / datumLimit) : { t: one.tS, y: one.y };
      if (t.length < 8 || !(spanS > 0)) return [];
      return [
        {
          segment: ringDownSegment({ tS: t, y, ...(one.shift === undefined ? {} : { shift: one.shift }) }),
          spanS,
          stepS: spanS / (t.length - 1),
        },
      ];
    });
}

/** From three quarters of a period in the longest segment to three data in a period, in steps finer than the resolution. */
function frequencies(segments: readonly { spanS: number; stepS: number }[]): number[] {
  const spanS = Math.max(...segments.map((one) => one.spanS));
  const stepS = Math.max(...segments.map((one) => one.stepS));
  const highest = (2 * Math.PI) / (3 * stepS);
  const result: number[] = [];
  for (let omega = (1.5 * Math.PI) / spanS; omega < highest; omega += Math.max(1.2 / spanS, 0.02 * omega)) result.push(omega);
  return result;
}

function scan(segments: readonly SeparableSegment[], grid: readonly number[]): (RingDownStart & { ssr: number })[] {
  const profile = grid.map((omega) => {
    const trials = dampings.map((ratio) => ({ omega, gamma: ratio * omega, ssr: residualSumAt(segments, [omega, ratio * omega]) }));
    return trials.reduce((a, b) => (b.ssr < a.ssr ? b : a));
  });
  return profile
    .filter((one, k) => one.ssr <= (profile[k - 1]?.ssr ?? Infinity) && one.ssr <= (profile[k + 1]?.ssr ?? Infinity))
    .sort((a, b) => a.ssr - b.ssr)
    .slice(0, valleys);
}

function descend(segments: readonly SeparableSegment[], start: RingDownStart, fastest: number): Descended | null {
  const allowed = (alpha: readonly number[]) => isOscillation(alpha) && (alpha[0] as number) <= fastest;
  try {
    const fit = fitSeparable(segments, [start.omega, start.gamma], { maxIterations: 40, tolerance: 1e-6, allowed });
    const residuals = Float64Array.from(fit.segments.flatMap((one) => [...one.residuals]));
    return { omega: fit.alpha[0] as number, gamma: fit.alpha[1] as number, ssr: fit.ssr, residuals };
  } catch {
    return null;
  }
}

/** Whether ω and γ describe something that swings: it rings for at least a third of a period and does not grow fast. */
export function isOscillation([omega, gamma]: readonly number[]): boolean {
  return omega !== undefined && gamma !== undefined && omega > 0 && gamma < omega && gamma > -0.05 * omega;
}

function scatterOf(y: Float64Array): number {
  const middle = y.reduce((sum, value) => sum + value, 0) / y.length;
  return y.reduce((sum, value) => sum + (value - middle) ** 2, 0) / y.length;
}
