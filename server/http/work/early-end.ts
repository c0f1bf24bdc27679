import { formatClock } from '@/shared/lib/format-time';
import type { RoomHours } from '@/shared/schedule/plan';
import { againstRoom, endOfWindow } from '@/shared/schedule/room';
import type { RunDriver } from '../../engine/run-driver';
import type { RunFacts } from '../../engine/run-facts';
import type { Database } from '../../store/database';
import { hoursOfRoom } from '../../store/schedules';
import { heedFewGood } from './few-good';
import type { Condition } from './rig-conditions';

/** What ends a run on a whole pair by itself: few good dwells, and the end of the night window of its room where holds or bad dwells have moved it beyond. */

export async function heedEarlyEnd(
  db: Database,
  driver: RunDriver,
  { timeZone, ...rig }: { labId: string; rigId: string; timeZone: string },
): Promise<Condition[]> {
  await heedFewGood(driver);
  const room = { hours: await hoursOfRoom(db, rig), timeZone };
  const finishByUtcMs = finishByOf(driver.facts(), room);
  if (finishByUtcMs !== null) await driver.requests.finishEarly('', finishByUtcMs);
  const facts = driver.facts();
  const words = endsForWindow(facts, timeZone) ?? lateWords(facts, room);
  return words === null ? [] : [{ code: 'late-finish', subject: '', words, runId: facts.runId }];
}

/** The window has ended the run early, or will: in words; else null. */
function endsForWindow(
  { finishing, predictedEndUtcMs }: Pick<RunFacts, 'finishing' | 'predictedEndUtcMs'>,
  timeZone: string,
): string | null {
  if (finishing === null || finishing.by !== '' || finishing.withdrawnBy !== null || finishing.finishByUtcMs === null) return null;
  const clock = (utcMs: number) => formatClock(utcMs, { timeZone });
  // Held for long, it may be too late even so: then that is what is told.
  if (predictedEndUtcMs !== null && predictedEndUtcMs > finishing.finishByUtcMs) return null;
  const early = predictedEndUtcMs === null ? '' : `, at about ${clock(predictedEndUtcMs)}`;
  return `The night window ends at ${clock(finishing.finishByUtcMs)}: the run ends on a whole pair before that${early}.`;
}

/**
 * By when a run is to be over that was planned to end within the night window and will not, UTC ms; null: nothing is decided for the people: it was
 * started to go beyond, they have decided already, or not even the pair under way would be over by then.
 */
export function finishByOf(
  {
    startedAtUtcMs,
    predictedEndUtcMs,
    plannedEndUtcMs,
    finishing,
  }: Pick<RunFacts, 'startedAtUtcMs' | 'predictedEndUtcMs' | 'plannedEndUtcMs' | 'finishing'>,
  { hours, timeZone }: Room,
): number | null {
  if (finishing !== null || hours.nightWindow === null || startedAtUtcMs === null) return null;
  if (againstRoom(hours, { startUtcMs: startedAtUtcMs, endUtcMs: plannedEndUtcMs }, timeZone) !== null) return null;
  const endUtcMs = endOfWindow(hours.nightWindow, { startUtcMs: startedAtUtcMs, timeZone });
  return predictedEndUtcMs !== null && predictedEndUtcMs > endUtcMs ? endUtcMs : null;
}

interface Room {
  hours: RoomHours;
  timeZone: string;
}

/** Where a run begins within the hours of its room and is to end outside of them: in words; else null. */
export function lateWords(
  { startedAtUtcMs, predictedEndUtcMs }: Pick<RunFacts, 'startedAtUtcMs' | 'predictedEndUtcMs'>,
  { hours, timeZone }: Room,
): string | null {
  if (startedAtUtcMs === null || predictedEndUtcMs === null) return null;
  const beginning = againstRoom(hours, { startUtcMs: startedAtUtcMs, endUtcMs: startedAtUtcMs + 1 }, timeZone);
  return beginning === null ? againstRoom(hours, { startUtcMs: startedAtUtcMs, endUtcMs: predictedEndUtcMs }, timeZone) : null;
}
