import type { StepRow } from '../archive/run-records';
import type { RigDocument } from '../rig/document';

/** Which rows of the step log are fitted, which side they are on, and from when to when their samples count. */
export interface DwellWindow {
  row: StepRow;
  /** Turntable angle during the row, deg; null where the log has none. */
  angleDeg: number | null;
  /** +1 near, −1 far, 0 neither. */
  side: 1 | -1 | 0;
  /** As reported: near, far, or what the log says. */
  station: string;
  /** Station of the rig whose uncertainty the angle carries; null where there is none. */
  stationKey: string | null;
  /** The row without the guard at both ends. */
  fromUtcMs: number;
  toUtcMs: number;
  /** Why the row is left out altogether; null while nothing speaks against it. */
  why: string | null;
}

/** A station is met within this angle. */
const toleranceDeg = 1;

/** Samples this close to a swing are left out, so that a small error between the two clocks does no harm. */
const guardS = 3;

/** Rows that hold a ring-down: dwells, and what follows a kick. */
export function dwellWindows(steps: readonly StepRow[], rig: RigDocument): DwellWindow[] {
  return steps.filter(({ kind }) => kind === 'dwell' || kind === 'ring-down').map((row) => windowOf(row, rig));
}

function windowOf(row: StepRow, rig: RigDocument): DwellWindow {
  const angleDeg = row.angleEndDeg ?? row.angleStartDeg;
  const side = angleDeg === null ? 0 : sideOf(angleDeg, rig);
  const endUtcMs = row.endUtcMs ?? row.startUtcMs;
  const lengthS = (endUtcMs - row.startUtcMs) / 1000;
  const guard = (uS: number) => Math.min(lengthS / 10, Math.min(guardS, lengthS / 50) + 3 * uS) * 1000;
  return {
    row,
    angleDeg,
    side,
    station: side === 0 ? row.station : side === 1 ? 'near' : 'far',
    stationKey: angleDeg === null ? null : stationKeyOf(angleDeg, side, rig),
    fromUtcMs: row.startUtcMs + guard(row.uStartS),
    toUtcMs: endUtcMs - guard(row.uEndS ?? row.uStartS),
    why: reasonAgainst(row, angleDeg),
  };
}

function reasonAgainst(row: StepRow, angleDeg: number | null): string | null {
  if (row.endUtcMs === null || row.outcome === null) return 'not finished';
  if (row.outcome === 'failed' || row.outcome === 'skipped') return row.outcome;
  if (row.good === false) return 'not good';
  return angleDeg === null ? 'angle not known' : null;
}

/** Smallest difference of two turntable angles of which one may be half a turn further, deg. */
function distanceDeg(a: number, b: number, period: number): number {
  const turned = Math.abs(a - b) % period;
  return Math.min(turned, period - turned);
}

function sideOf(angleDeg: number, rig: RigDocument): 1 | -1 | 0 {
  const [near, far] = (['near', 'far'] as const).map((name) => {
    const station = rig.stations[name];
    return station === undefined ? Infinity : distanceDeg(angleDeg, station.value, 180);
  }) as [number, number];
  if (Math.min(near, far) > toleranceDeg + 1e-9) return 0;
  return near <= far ? 1 : -1;
}

/** The nearest station itself; half a turn away from near or far, where no station of its own is named, that one. */
function stationKeyOf(angleDeg: number, side: 1 | -1 | 0, rig: RigDocument): string | null {
  const own = side === 0 ? null : side === 1 ? 'near' : 'far';
  const meets = (name: string, period: number) =>
    distanceDeg(angleDeg, rig.stations[name]?.value ?? Infinity, period) <= toleranceDeg + 1e-9;
  if (own !== null && meets(own, 360)) return own;
  return Object.keys(rig.stations).find((name) => meets(name, 360)) ?? own;
}

/** Row length, s. */
export function lengthS(window: DwellWindow): number {
  return ((window.row.endUtcMs ?? window.row.startUtcMs) - window.row.startUtcMs) / 1000;
}
