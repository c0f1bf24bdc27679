import { occurrencesOf, stoodWithin, type Occurrence } from '@/shared/alarms/occurrences';
import type { RunAlarm } from '@/shared/contracts/alarms';
import { kindOf, type AlarmRecord } from '../store/alarms';
import { alarmsById, historyOfRun, reachedBy } from '../store/alarms-read';
import { allRigNames } from '../store/rigs';
import type { RunRecord } from '../store/runs-read';
import { isoOf, isoOrNull } from './maker';
import type { Services } from './services';

/** Alarms of a start that is still to come are no news of the run that goes on. */
const ofOtherRuns = ['not-armed', 'missed-start'];

const keyOf = ({ alarmId, occurrence }: Pick<Occurrence, 'alarmId' | 'occurrence'>) => `${alarmId} ${String(occurrence)}`;

/** What was raised for a run, and what of its rig and of the lab stood while it went on. */
export async function alarmsOfRun(services: Services, run: RunRecord): Promise<RunAlarm[]> {
  const { db } = services.database;
  const { labId, rigId, startedAt, endedAt } = run;
  // No room has anything to do with a rehearsal.
  if (run.rehearsal || startedAt === null) return [];
  const window = { fromUtcMs: startedAt, toUtcMs: endedAt };
  const history = await historyOfRun(db, { labId, rigId, runId: run.id, ...window });
  const ids = [...new Set(history.map(({ alarmId }) => alarmId))];
  const alarms = new Map((await alarmsById(db, labId, ids)).map((alarm) => [alarm.id, alarm]));
  const own = new Set(history.filter(({ fact, runId }) => fact === 'raised' && runId === run.id).map(keyOf));
  const found = occurrencesOf(history, (id) => kindOf(alarms.get(id)?.code ?? '').momentary).filter(
    (one) => own.has(keyOf(one)) || stoodWithin(one, window),
  );
  const reached = await reachedBy(db, labId, found);
  const rigNames = await allRigNames(db, labId);
  return found.flatMap((one) => {
    const alarm = alarms.get(one.alarmId);
    if (alarm === undefined || ofOtherRuns.includes(alarm.code)) return [];
    const told = reached.filter((hop) => keyOf(hop) === keyOf(one)).map(({ name }) => name);
    return [viewOf(one, { alarm, told, rigName: alarm.rigId === null ? null : (rigNames.get(alarm.rigId) ?? null) })];
  });
}

function viewOf(one: Occurrence, { alarm, rigName, told }: { alarm: AlarmRecord; rigName: string | null; told: string[] }): RunAlarm {
  const { title, cause, consequence, priority, momentary } = kindOf(alarm.code);
  const { alarmId, occurrence, words, raisedUtcMs, untilUtcMs, seen, done, aside } = one;
  // One that came back before anybody had seen it is the same occurrence, and holds.
  const holds = !momentary && alarm.snapshot.active && alarm.snapshot.occurrence === occurrence;
  return {
    ...{ alarmId, occurrence, code: alarm.code, title, cause, consequence, priority, rigName, words, told },
    raisedAt: isoOf(raisedUtcMs),
    untilAt: holds ? null : isoOrNull(untilUtcMs),
    seen: seen === null ? null : { by: seen.by, at: isoOf(seen.utcMs) },
    done: done === null ? null : { by: done.by, at: isoOf(done.utcMs), note: done.note },
    aside: aside === null ? null : { by: aside.by, at: isoOf(aside.utcMs), why: aside.why },
  };
}
