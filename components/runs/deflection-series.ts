import { angleRadOfSpot, leverOf } from '@/shared/physics/lever';
import type { RigDocument } from '@/shared/rig/document';
import { valueAt, type Series } from '@/components/charts/curve';

/** Readings of a deflection channel as pendulum angles for drawing. Pure. */

const radPer: Record<string, number> = { rad: 1, mrad: 1e-3, urad: 1e-6 };
const metresPer: Record<string, number> = { m: 1, mm: 1e-3 };

/**
 * Pendulum angle (rad) for readings in `unit`: angles are scaled, spot positions go through the lever, counted from its
 * zero or, where that is unknown, from the middle of the readings. Null for a unit that is neither.
 */
export function toRad(value: ArrayLike<number>, unit: string, rig: RigDocument): Float64Array | null {
  const angle = radPer[unit];
  if (angle !== undefined) return Float64Array.from(value, (y) => y * angle);
  const metres = metresPer[unit];
  const lever = leverOf(rig);
  if (metres === undefined || lever === null) return null;
  const zeroM = rig.lever?.zero === undefined ? meanOf(value) * metres : lever.zeroM;
  return Float64Array.from(value, (y) => angleRadOfSpot(y * metres, { ...lever, zeroM }));
}

function meanOf(values: ArrayLike<number>): number {
  let sum = 0;
  let count = 0;
  for (let i = 0; i < values.length; i += 1) {
    const y = values[i] as number;
    if (!Number.isFinite(y)) continue;
    sum += y;
    count += 1;
  }
  return count === 0 ? 0 : sum / count;
}

/**
 * How far the channel's unknown zero lies from the prediction's: the median difference where both are known, over the
 * newest part, so that slow creep does not draw the two apart at the now-line. 0 without an overlap.
 */
export function zeroOffset(measured: Series, predicted: Series, newest = 200): number {
  const differences: number[] = [];
  for (let i = Math.max(0, measured.x.length - newest * 4); i < measured.x.length; i += 4) {
    const expected = valueAt(predicted, measured.x[i] as number, Infinity);
    const y = measured.y[i] as number;
    if (expected !== null && Number.isFinite(y)) differences.push(y - expected);
  }
  if (differences.length === 0) return 0;
  differences.sort((a, b) => a - b);
  return differences[differences.length >> 1] as number;
}

export const shiftedBy = (series: Series, offset: number): Series => ({ x: series.x, y: Float64Array.from(series.y, (y) => y + offset) });

/** The part of a series from an instant on. */
export function from(series: Series, utcMs: number): Series {
  const x = Array.from(series.x);
  const first = x.findIndex((at) => at >= utcMs);
  return first < 0 ? { x: [], y: [] } : { x: x.slice(first), y: Array.from(series.y).slice(first) };
}
