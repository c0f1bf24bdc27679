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
  return withoutTurningBack(steps.filter(({ kind }) => kind === 'rotate')).flatMap((row) => windowOf(row, rig) ?? []);
}

/** A way out, in one row or in several where it was held, and how far it has been turned back. */
interface WayOut {
  fromDeg: number;
  /** Where the table stands. */
  atDeg: number;
  sense: number;
  /** Rows against its sense so far: they are turning back if they end where it began. */
  back: StepRow[];
}

function withoutTurningBack(rotations: readonly StepRow[]): StepRow[] {
  const found: StepRow[] = [];
  let out: WayOut | null = null;
  for (const row of rotations) {
    const { angleStartDeg, angleEndDeg } = row;
    if (angleStartDeg === null || angleEndDeg === null || angleStartDeg === angleEndDeg) continue;
    const sense = Math.sign(angleEndDeg - angleStartDeg);
    const goesOn: boolean = out !== null && isNear(angleStartDeg, out.atDeg) && (out.back.length === 0 || sense !== out.sense);
    if (out === null || !goesOn) {
      found.push(...evaluatedOf(out), row);
      out = { fromDeg: angleStartDeg, atDeg: angleEndDeg, sense, back: [] };
      continue;
    }
    out.atDeg = angleEndDeg;
    if (sense === out.sense) found.push(row);
    else out.back.push(row);
    if (out.back.length === 0) continue;
    if (isNear(angleEndDeg, out.fromDeg)) out = null;
    else if ((angleEndDeg - out.fromDeg) * out.sense < 0) {
      found.push(...out.back);
      out = { fromDeg: out.back[0]?.angleStartDeg ?? angleStartDeg, atDeg: angleEndDeg, sense, back: [] };
    }
  }
  return [...found, ...evaluatedOf(out)];
}

/** Rows against a way out that never came back to where it began: turns of their own, unless the way back was broken off. */
function evaluatedOf(out: WayOut | null): StepRow[] {
  const last = out?.back.at(-1);
  return out === null || last?.outcome === 'cut short' || last?.outcome === 'failed' ? [] : out.back;
}

const isNear = (aDeg: number, bDeg: number): boolean => Math.abs(aDeg - bDeg) <= sameAngleDeg;

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
