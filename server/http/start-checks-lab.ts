import type { StartCheck } from '@/shared/contracts/rigs';
import { formatFixed, NARROW_SPACE } from '@/shared/lib/format-number';
import { formatDayAndClock } from '@/shared/lib/format-time';
import type { Timeline } from '@/shared/protocol/timeline';
import { cautionsVersion } from '@/shared/rig/cautions';
import type { RigStation } from '../interfaces/rig-stations';
import { ping } from '../store/health';
import { signaturesOf } from '../store/locks';
import { activeRuns, type RunListRow } from '../store/runs-read';
import { dataCheck, waitedChannelsCheck } from './data-check';
import type { Services } from './services';
import { check, fail, note, pass, type Outcome, type StartPlan } from './start-check-parts';

/** What the lab and its server say: data, storage, other runs, and who answers for the rig. */

const slowDatabaseMs = 1_000;
const gib = 2 ** 30;
/** Room that a run leaves for all else, and what an hour of it takes at 10 Hz (10 × 3600 rows of 200 bytes: an estimate, no source). */
const reserveBytes = gib;
const bytesPerHour = 36_000 * 200;

interface Seen {
  station: RigStation | null;
  timeline: Timeline;
  nowUtcMs: number;
}

export async function labChecks(services: Services, plan: StartPlan, seen: Seen): Promise<StartCheck[]> {
  const runs = await activeRuns(services.database.db, plan.rig.labId);
  const waited = await waitedChannelsCheck(services, plan, seen.station);
  return [
    check('data', 'Deflection', await dataCheck(services, plan, seen.station)),
    ...(waited === null ? [] : [check('waited-channels', 'Waited for', waited)]),
    check('database', 'Database', await databaseCheck(services)),
    check('disk', 'Free disk', await diskCheck(services, seen.timeline)),
    check('free', 'No other run', freeCheck(services, plan.rig.id, runs.get(plan.rig.id))),
    check('lock', 'Nobody at the rig', lockCheck(services, plan)),
    check('armed', 'Armed on site', armedCheck(services, plan, seen)),
    check('cautions', 'Cautions', await cautionsCheck(services, plan)),
  ];
}

async function databaseCheck({ database, clock }: Services): Promise<Outcome> {
  const beforeMs = clock.monotonicMs();
  const answers = await ping(database);
  const tookMs = clock.monotonicMs() - beforeMs;
  const figure = { name: 'answer', value: tookMs, unit: 'ms' as const };
  if (!answers) return fail('It does not answer: nothing is set in motion before it does.', figure);
  return tookMs > slowDatabaseMs
    ? note('It answers slowly; a run is held when it does not answer for 4 s.', figure)
    : pass('Answers.', figure);
}

async function diskCheck({ freeBytes }: Services, { durationS }: Timeline): Promise<Outcome> {
  const free = await freeBytes();
  const need = reserveBytes + (bytesPerHour * durationS) / 3600;
  const figures = [
    { name: 'free', value: free === null ? null : free / gib, unit: 'GiB' as const },
    { name: 'need', value: need / gib, unit: 'GiB' as const },
  ];
  if (free === null) return note('Not known: the system does not tell it for the folder of this server.', ...figures);
  if (free >= need) return pass('Enough for this run.', ...figures);
  const lacking = formatFixed((need - free) / gib, { decimals: 1 });
  return fail(`Not enough for this run: make room for ${lacking}${NARROW_SPACE}GiB on the disk of the server.`, ...figures);
}

function freeCheck(services: Services, rigId: string, run: RunListRow | undefined): Outcome {
  const quarantined = services.supervisor.quarantinedOf(rigId);
  if (quarantined !== null) return fail(quarantined.why);
  const guidedBy = services.guided.takenBy(rigId);
  if (guidedBy !== null) return fail(guidedBy);
  return run === undefined ? pass('The rig is free.') : fail(busyWords(run));
}

/** Names the run that has the rig; there is never more than one. */
export const busyWords = (run: RunListRow): string =>
  `The run of "${run.protocolName}", revision ${String(run.protocolRevision)}, started by ${run.operator}, is ${run.state}. Wait for its end, or stop it.`;

function armedCheck(services: Services, { rig, timeZone }: StartPlan, { timeline, nowUtcMs }: Seen): Outcome {
  const arm = services.arms.armOf(rig.id);
  if (arm === null) return fail(notArmed(services, rig.id));
  const until = formatDayAndClock(arm.untilUtcMs, timeZone);
  const figures = [
    { name: 'armed for', value: (arm.untilUtcMs - nowUtcMs) / 1000, unit: 's' as const },
    { name: 'to spare', value: (arm.untilUtcMs - timeline.endUtcMs) / 1000, unit: 's' as const },
  ];
  if (arm.untilUtcMs > timeline.endUtcMs) return pass(`By ${arm.name} until ${until}.`, ...figures);
  return fail(
    `${arm.name} answers for it until ${until}, but the run would finish at ${formatDayAndClock(timeline.endUtcMs, timeZone)}: arm it for longer.`,
    ...figures,
  );
}

function notArmed(services: Services, rigId: string): string {
  const ended = services.arms.endedOf(rigId);
  return `Nobody on site answers for the rig: arm it there first.${ended === null ? '' : ` The last time: ${ended.why}.`}`;
}

function lockCheck(services: Services, { rig }: StartPlan): Outcome {
  const lockedBy = services.locks.lockedBy(rig.id);
  return lockedBy === null ? pass('No personal lock is set.') : fail(lockedBy);
}

async function cautionsCheck(services: Services, { rig, userId }: StartPlan): Promise<Outcome> {
  const signatures = await signaturesOf(services.database.db, { labId: rig.labId, rigId: rig.id });
  return signatures.some((each) => each.userId === userId && each.version === cautionsVersion)
    ? pass('Signed by you for this rig.')
    : fail('You have not signed the cautions for this rig in their present words: read and sign them.');
}
