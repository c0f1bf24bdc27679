import type { BoxAverages } from '../statistics/box-average';
import type { RingDownData } from '../statistics/ring-down';
import type { DwellWindow } from './dwell-windows';

/** One window that is fitted, with its averaged data. */
export interface Segment {
  window: DwellWindow;
  averages: BoxAverages;
  /** What the sources add to ω² there, rad2/s2. */
  shift: number;
  /** Instant of the reported centre, s after the window's start. */
  centreS: number;
  /** Instants, s after the window's start, at which something knocked the pendulum. */
  knocksS: readonly number[];
  /** Share with which each datum counts, 1 for an undisturbed one; null: all count in full. */
  trust: Float64Array | null;
}

/** The segment as the fit takes it. */
export function dataOf({ averages, shift, centreS, knocksS, trust }: Segment): RingDownData {
  const weight = trust === null ? averages.weight : averages.weight.map((value, i) => value * (trust[i] as number));
  return { tS: averages.t, y: averages.y, weight, centreS, shift, knocksS };
}
