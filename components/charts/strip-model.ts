/** What the swing strip shows, whether it was planned, is running or is over. Pure. */

export type Lane = 'near' | 'far' | 'other';

export interface StripStep {
  /** Unique within the strip: the path of a planned step or the seq of an executed one. */
  key: string;
  kind: string;
  /** Station at the step's end; empty at an angle without a name. */
  station: string;
  label: string;
  startUtcMs: number;
  endUtcMs: number;
  angleFromDeg: number;
  angleToDeg: number;
  phase: 'past' | 'running' | 'planned';
  /** For dwells: false when the dwell is not good. */
  good: boolean | null;
  outcome: string | null;
}

/** An item of `planTimeline`. */
export interface PlannedStep {
  path: string;
  kind: string;
  label: string;
  station: string;
  startUtcMs: number;
  endUtcMs: number;
  angleFromDeg: number;
  angleToDeg: number;
  /** Of moves: deg/s and deg/s2. */
  speedDegS?: number;
  accelerationDegS2?: number;
}

/** A row of the step log. */
export interface LoggedStep {
  seq: number;
  kind: string;
  label: string;
  station: string;
  startUtcMs: number;
  endUtcMs: number | null;
  plannedEndUtcMs: number | null;
  angleStartDeg: number | null;
  angleEndDeg: number | null;
  outcome: string | null;
  good: boolean | null;
}

/** Stations at the back are those at the front turned by half a turn: the torque is the same. */
export function laneOf(station: string): Lane {
  if (station.startsWith('near')) return 'near';
  if (station.startsWith('far')) return 'far';
  return 'other';
}

export function stepsOfPlan(items: readonly PlannedStep[], phase: StripStep['phase'] = 'planned'): StripStep[] {
  return items.map((item) => ({ ...item, key: item.path, phase, good: null, outcome: null }));
}

/** Rows of the step log; the running one reaches to its planned end. */
export function stepsOfLog(rows: readonly LoggedStep[]): StripStep[] {
  let angleDeg = 0;
  return rows.map((row) => {
    const angleFromDeg = row.angleStartDeg ?? angleDeg;
    angleDeg = row.angleEndDeg ?? angleFromDeg;
    return {
      key: `seq ${row.seq}`,
      kind: row.kind,
      station: row.station,
      label: row.label,
      startUtcMs: row.startUtcMs,
      endUtcMs: row.endUtcMs ?? Math.max(row.startUtcMs, row.plannedEndUtcMs ?? row.startUtcMs),
      angleFromDeg,
      angleToDeg: angleDeg,
      phase: row.outcome === null && row.endUtcMs === null ? 'running' : 'past',
      good: row.good,
      outcome: row.outcome,
    };
  });
}

const moving = new Set(['swing', 'home', 'rotate', 'kick']);

/** Whether the sources move during the step. */
export const isMotion = (step: { kind: string }): boolean => moving.has(step.kind);

/** A stretch of time in which the sources stand in one lane: a dwell, a settle, or several of them one after another. */
export interface Stand {
  lane: Lane;
  station: string;
  startUtcMs: number;
  endUtcMs: number;
  phase: StripStep['phase'];
  measured: boolean;
  good: boolean | null;
  cutShort: boolean;
  keys: string[];
}

/** Where the sources stand when. A dwell is its own stand; steps in between that measure nothing are joined. */
export function standsOf(steps: readonly StripStep[]): Stand[] {
  const stands: Stand[] = [];
  for (const step of steps) {
    if (isMotion(step) || step.endUtcMs <= step.startUtcMs) continue;
    const measured = step.kind === 'dwell' || step.kind === 'ring-down';
    const previous = stands.at(-1);
    const joins = previous && !measured && !previous.measured && previous.station === step.station && previous.phase === step.phase;
    if (joins) {
      previous.endUtcMs = step.endUtcMs;
      previous.keys.push(step.key);
    } else {
      stands.push({
        lane: laneOf(step.station),
        station: step.station,
        startUtcMs: step.startUtcMs,
        endUtcMs: step.endUtcMs,
        phase: step.phase,
        measured,
        good: step.good,
        cutShort: step.outcome === 'cut short',
        keys: [step.key],
      });
    }
  }
  return stands;
}
