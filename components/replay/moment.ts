import { gapOf, valueAt, type Series } from '@/components/charts/curve';
import type { RunAlarm } from '@/shared/contracts/alarms';
import type { StepRowView } from '@/shared/contracts/runs';
import { trapezoid } from '@/shared/physics/trapezoid';
import type { RigDocument } from '@/shared/rig/document';

/** What a run was doing at an instant. Pure. */

export interface Moment {
  row: StepRowView | null;
  /** That step is over and the next has not begun: the run was held. */
  between: boolean;
  /** Turntable, deg; null before its angle is known. */
  angleDeg: number | null;
  /** Measured pendulum angle, rad; null in a gap. */
  rad: number | null;
}

/** A shorter gap in the samples is not shown, ms; nor is what lies between two of those that a long night is drawn by. */
const leastGapMs = 60_000;
/** Steps that follow each other may be told a little apart, ms. */
const leastPauseMs = 1000;

export interface NightRecord {
  rows: readonly StepRowView[];
  /** x in UTC ms, y in rad. */
  measured: Series | null;
  rig: RigDocument;
}

export function momentAt({ rows, measured, rig }: NightRecord, utcMs: number): Moment {
  const row = rows.findLast((one) => one.startUtcMs <= utcMs) ?? null;
  return {
    row,
    between: row?.endUtcMs != null && utcMs > row.endUtcMs + leastPauseMs,
    angleDeg: row === null ? null : angleAt(row, rig, utcMs),
    rad: measured === null ? null : valueAt(measured, utcMs, Math.max(leastGapMs, gapOf(measured.x))),
  };
}

/** Between the angles at both ends of a motion: speeding up and slowing down as the rig does, stretched to the time that it took. */
function angleAt({ angleStartDeg, angleEndDeg, startUtcMs, endUtcMs }: StepRowView, rig: RigDocument, utcMs: number): number | null {
  if (angleStartDeg === null || angleEndDeg === null || endUtcMs === null) return angleStartDeg ?? angleEndDeg;
  if (utcMs >= endUtcMs || angleStartDeg === angleEndDeg || rig.motion === undefined) return angleEndDeg;
  const { maxSpeed_deg_s: speedDegS, maxAcceleration_deg_s2: accelerationDegS2 } = rig.motion;
  const move = trapezoid({ fromDeg: angleStartDeg, toDeg: angleEndDeg, speedDegS, accelerationDegS2 });
  return move.angleDegAt(((utcMs - startUtcMs) / (endUtcMs - startUtcMs)) * move.durationS);
}

/** Where the next or the previous step begins; the ends of the run where there is none. */
export function neighbourStart(rows: readonly StepRowView[], utcMs: number, by: 1 | -1): number | null {
  const starts = rows.map(({ startUtcMs }) => startUtcMs);
  return (by === 1 ? starts.find((start) => start > utcMs + 1) : starts.findLast((start) => start < utcMs - 1)) ?? null;
}

export type AlarmMoment = 'to come' | 'now' | 'over';

/** A shorter alarm, as of a clock that stepped, is shown for so long, ms: a replay would pass it by unseen. */
const leastShownMs = 60_000;

/** What an alarm is at an instant; one that is not over yet stands to the end. */
export function alarmMoment({ raisedAt, untilAt }: Pick<RunAlarm, 'raisedAt' | 'untilAt'>, utcMs: number): AlarmMoment {
  const raisedUtcMs = Date.parse(raisedAt);
  if (utcMs < raisedUtcMs) return 'to come';
  return untilAt === null || utcMs < Math.max(Date.parse(untilAt), raisedUtcMs + leastShownMs) ? 'now' : 'over';
}
