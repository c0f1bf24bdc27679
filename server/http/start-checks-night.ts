import type { StartCheck } from '@/shared/contracts/rigs';
import { formatClock, formatDayAndClock } from '@/shared/lib/format-time';
import { adviseSurroundings } from '@/shared/protocol/advise-surroundings';
import type { Timeline } from '@/shared/protocol/timeline';
import { againstRoom } from '@/shared/schedule/room';
import { camerasOf } from '../store/cameras';
import { listRigRevisions } from '../store/rigs';
import { hoursOfRoom } from '../store/schedules';
import { calendarOf } from './calendar';
import type { Services } from './services';
import { check, note, pass, type StartPlan } from './start-check-parts';

/** What whoever starts by hand decides with open eyes: the hours of the room, starts that are scheduled meanwhile, measured values that something has changed since, and cameras that show nothing. None of them keeps a run from starting. */
export async function nightChecks({ database, clock }: Services, plan: StartPlan, timeline: Timeline): Promise<StartCheck[]> {
  const checks = [roomCheck, scheduleCheck, calibrationCheck].map((look) => look(database, plan, timeline));
  return [...(await Promise.all(checks)).flat(), ...(await cameraCheck(database, plan, clock.utcMs()))];
}

type Asked<T> = (database: Services['database'], plan: StartPlan, timeline: Timeline) => Promise<T[]>;

const roomCheck: Asked<StartCheck> = async ({ db }, { rig, timeZone }, { startUtcMs, endUtcMs }) => {
  const hours = await hoursOfRoom(db, { labId: rig.labId, rigId: rig.id });
  if (hours.nightWindow === null && hours.blackouts.length === 0) return [];
  const against = againstRoom(hours, { startUtcMs, endUtcMs }, timeZone);
  const outcome =
    against === null
      ? pass(`It would be over at ${formatClock(endUtcMs, { timeZone })}, within the hours of the room.`)
      : note(`${against} Started all the same, it is not ended at that time by itself.`);
  return [check('room', 'Hours of the room', outcome)];
};

/** Of two runs on one rig only one can be: the start that comes while this one goes on is missed. */
const scheduleCheck: Asked<StartCheck> = async ({ db }, { rig, timeZone }, { startUtcMs, endUtcMs }) => {
  const coming = await calendarOf(db, { labId: rig.labId, rigId: rig.id, timeZone, fromUtcMs: startUtcMs, untilUtcMs: endUtcMs });
  const first = coming.find(({ state, dueAt }) => state === 'planned' && Date.parse(dueAt) > startUtcMs);
  if (first === undefined) return [];
  const due = formatDayAndClock(Date.parse(first.dueAt), timeZone);
  return [
    check(
      'schedule',
      'Scheduled starts',
      note(`"${first.protocolName}" is scheduled here for ${due}, while this run would still be on: that start would be missed.`),
    ),
  ];
};

const calibrationCheck: Asked<StartCheck> = async ({ db }, { rig, protocol, timeZone }, { startUtcMs, endUtcMs }) => {
  const revisions = await listRigRevisions(db, rig.labId, rig.id);
  const night = { protocol, startUtcMs, endUtcMs, timeZone, reverses: false };
  return adviseSurroundings({ revisions }, night).map(({ message }) => check('calibration', 'Measured values', note(message)));
};

/** A picture that is older shows nothing of tonight, ms. */
const oldPictureMs = 60_000;

/** A run asks its cameras at each mark and swing; one that fails is a note of the run and holds it never, so whoever starts should hear of it before. */
async function cameraCheck({ db }: Services['database'], { rig, timeZone }: StartPlan, nowUtcMs: number): Promise<StartCheck[]> {
  const cameras = await camerasOf(db, { labId: rig.labId, rigId: rig.id });
  if (cameras.length === 0) return [];
  const silent = cameras.flatMap(({ name, kind, status, takenAt }) => {
    if (status !== null && status.reason !== null) return [`${name}: ${status.reason}`];
    if (kind !== 'pushed') return [];
    if (takenAt === null) return [`${name} has sent no picture yet`];
    return nowUtcMs - takenAt > oldPictureMs ? [`${name} sent its last picture ${formatDayAndClock(takenAt, timeZone)}`] : [];
  });
  const outcome =
    silent.length === 0
      ? pass(
          cameras.length === 1
            ? 'The camera gives pictures, as far as it was asked.'
            : `${String(cameras.length)} cameras give pictures, as far as they were asked.`,
        )
      : note(`${silent.join('; ')}. The run goes on without its frames.`);
  return [check('cameras', 'Cameras', outcome)];
}
