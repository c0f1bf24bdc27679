import type { StepRow } from '../archive/run-records';
import { RAD_PER_DEG } from '../physics/constants';
import type { RigDocument } from '../rig/document';
import type { DwellWindow } from './dwell-windows';
import { rampShare } from './turntable';

/** Whole turns at a constant rate: what the modulation method looks at. */
export interface RotationWindow {
  window: DwellWindow;
  turns: number;
  /** Of the turntable; negative clockwise. */
  speedRadS: number;
  /** The turntable's angle at an instant of the log's clock within the window. */
  phiRad(utcMs: number): number;
}

/** Samples this close to the ramps are left out, so that a small error between the two clocks does no harm, s. */
const guardS = 3;
/** A rotation that ends so near to where the one before it began has turned back, deg. */
const sameAngleDeg = 1;

/** The rotations of a log that hold a whole turn at least. Turning back afterwards, which frees the cables, is not among them. */
export function rotationWindows(steps: readonly StepRow[], rig: RigDocument): RotationWindow[] {
  const rotations = steps.filter(({ kind }) => kind === 'rotate');
  const found: RotationWindow[] = [];
  let out: StepRow | null = null;
  for (const row of rotations) {
    if (out !== null && turnsBack(out, row)) out = null;
    else {
      out = row;
      const one = windowOf(row, rig);
      if (one !== null) found.push(one);
    }
  }
  return found;
}

function turnsBack(out: StepRow, row: StepRow): boolean {
  if (row.angleStartDeg === null || row.angleEndDeg === null || out.angleStartDeg === null || out.angleEndDeg === null) return false;
  return (
    Math.abs(row.angleStartDeg - out.angleEndDeg) <= sameAngleDeg &&
    Math.abs(row.angleEndDeg - out.angleStartDeg) <= sameAngleDeg &&
    out.angleStartDeg !== out.angleEndDeg
  );
}

/** The last whole turns before the table slows down, when the ringing of its start has died most. */
function windowOf(row: StepRow, rig: RigDocument): RotationWindow | null {
  const { startUtcMs, endUtcMs, angleStartDeg, angleEndDeg, outcome } = row;
  if (endUtcMs === null || angleStartDeg === null || angleEndDeg === null || outcome === 'failed' || outcome === 'skipped') return null;
  const lengthS = (endUtcMs - startUtcMs) / 1000;
  if (!(lengthS > 0) || angleStartDeg === angleEndDeg) return null;
  const rampS = lengthS * rampShare({ kind: 'rotate', startUtcMs, endUtcMs, fromDeg: angleStartDeg, toDeg: angleEndDeg }, rig);
  const speedRadS = ((angleEndDeg - angleStartDeg) * RAD_PER_DEG) / (lengthS - rampS);
  const turnS = (2 * Math.PI) / Math.abs(speedRadS);
  const turns = Math.floor((lengthS - 2 * rampS - 2 * guardS) / turnS);
  if (turns < 1) return null;
  const toUtcMs = endUtcMs - 1000 * (rampS + guardS);
  const fromUtcMs = toUtcMs - 1000 * turns * turnS;
  const middleRad = ((angleStartDeg + angleEndDeg) / 2) * RAD_PER_DEG;
  const middleUtcMs = (startUtcMs + endUtcMs) / 2;
  return {
    window: { row, angleDeg: null, side: 0, station: row.station, stationKey: null, fromUtcMs, toUtcMs, why: null },
    turns,
    speedRadS,
    phiRad: (utcMs) => middleRad + (speedRadS * (utcMs - middleUtcMs)) / 1000,
  };
}
