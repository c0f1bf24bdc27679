import { formatDayAndClock } from '@/shared/lib/format-time';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { reportCondition } from '../../store/alarms';
import { leftRigs, rigsWithAlarm, type LeftRig } from '../../store/left-rigs';
import { standingSchedules, type ScheduleRecord } from '../../store/schedules';
import type { Services } from '../services';

/**
 * Rigs that nobody drives although somebody counts on it: of several processes that of the rigs may end alone, and what watches over the rigs ends
 * with it. So one that does the jobs looks as well.
 */

/** A process that takes over, or is started again, is there long before. */
const leftForMs = 60_000;
/** A start counts on its rig from so long before it on, as it does on its arm. */
const startWithinMs = 120 * 60_000;

/** Raises the alarm of each rig that is left alone and ends that of the others. Returns the labs that have one, with what is told of it. */
export async function heedLeftRigs(services: Services): Promise<ReadonlyMap<string, string>> {
  const { db } = services.database;
  const utcMs = services.clock.utcMs();
  const left = await leftRigs(db, { forMs: leftForMs, nowUtcMs: utcMs });
  const schedules = left.length === 0 ? [] : (await standingSchedules(db)).filter(({ state }) => state === 'active');
  const found = left.flatMap((rig) => {
    const counted = countedOn(rig, schedules, utcMs);
    return counted === null ? [] : [{ ...rig, words: `No server has driven the rig for over a minute. ${counted}` }];
  });
  const told = await rigsWithAlarm(db, 'not-driven');
  const report = (rig: { labId: string; rigId: string }, condition: { met: boolean; words: string; runId: string | null }) => {
    const place = { labId: rig.labId, rigId: rig.rigId, code: 'not-driven' as const, subject: '' };
    return db.transaction((tx) => reportCondition(tx, place, { ...condition, utcMs }));
  };
  for (const rig of found)
    if (!told.some(({ rigId }) => rigId === rig.rigId)) await report(rig, { met: true, words: rig.words, runId: rig.runId });
  for (const rig of told) if (!found.some(({ rigId }) => rigId === rig.rigId)) await report(rig, { met: false, words: '', runId: null });
  return new Map(found.map(({ labId, name }) => [labId, `nobody drives ${name}`]));
}

/** What counts on the rig, in a sentence; null where nothing does. */
function countedOn({ rigId, runId, armed }: LeftRig, schedules: readonly ScheduleRecord[], nowUtcMs: number): string | null {
  if (runId !== null) return 'A run of it has not ended.';
  for (const { plan, timeZone, protocolName } of schedules.filter((schedule) => schedule.rigId === rigId)) {
    const [next] = occurrencesBetween(plan, timeZone, { afterUtcMs: nowUtcMs, untilUtcMs: nowUtcMs + startWithinMs, atMost: 1 });
    if (next !== undefined) return `"${protocolName}" is to start ${formatDayAndClock(next.dueUtcMs, timeZone)}.`;
  }
  return armed ? 'It is armed.' : null;
}
