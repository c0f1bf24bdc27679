import { verifyChain } from '@/shared/archive/chain';
import type { ChainedEvent, StepRow } from '@/shared/archive/run-records';
import type { MorningNight, MorningSheet } from '@/shared/contracts/morning';
import type { RoomChannel } from '@/shared/morning/room';
import { morningSheet } from '@/shared/morning/sheet';
import type { RecordFacts, SampleCover } from '@/shared/morning/ticks';
import { planTimeline } from '@/shared/protocol/timeline';
import { listEvaluations } from '../store/evaluations';
import { nightsBefore, rangeAndMeans } from '../store/nights';
import { channelsOfRun, readEvents, readSteps, type RunRecord } from '../store/runs-read';
import { spacingOf } from '../store/spacing';
import { filledDeflection } from './channel-to-evaluate';
import { startUtcMsOf, windowOf } from './run-window';
import type { Services } from './services';

const nightsShown = 5;

/** The morning sheet of a run that is over or held, read off its records. */
export async function morningOf(services: Services, run: RunRecord): Promise<MorningSheet> {
  const { db } = services.database;
  const own = { labId: run.labId, runId: run.id };
  const { fromUtcMs: startedAtUtcMs, toUtcMs: endUtcMs } = windowOf(run, services);
  const events = await readEvents(db, own, { afterSeq: 0 });
  const rows = await readSteps(db, own);
  const evaluations = (await listEvaluations(db, run.labId, run.id)).filter(({ recomputes }) => recomputes === null);
  const newest = evaluations.find(({ state, result }) => state === 'done' && result !== null);
  const angleDeg = run.start.rig.motion?.homeDeg ?? 0;
  return morningSheet({
    runId: run.id,
    rig: run.start.rig,
    startedAtUtcMs,
    endUtcMs,
    plan: planTimeline(run.start, { utcMs: startedAtUtcMs, angleDeg }),
    rows,
    events,
    record: recordOf(services, events),
    cover: await coverOf(services, run, newest?.channel ?? run.start.protocol.evaluation?.channel ?? null),
    room: await roomChannels(services, run, rows),
    result: newest?.result ?? null,
    failure: newest === undefined ? (evaluations[0]?.error ?? null) : null,
    earlier: await earlierNights(services, run),
  });
}

function recordOf(services: Services, events: readonly ChainedEvent[]): RecordFacts {
  const check = verifyChain(events, services.sha256);
  return { events: events.length, brokenAt: check.valid ? null : check.seq };
}

/** Of the channel that was or is to be evaluated, or else of the first that has deflection; null where none has. */
async function coverOf(services: Services, run: RunRecord, wanted: string | null): Promise<SampleCover | null> {
  const filled = await filledDeflection(services, run);
  const channel = filled.find(({ name }) => name === wanted) ?? filled[0];
  if (channel === undefined) return null;
  const window = windowOf(run, services);
  const { longestGapS, usualS } = await spacingOf(services.database, { ...window, labId: run.labId, channelId: channel.id });
  const everyS = channel.rateHz === null ? usualS : 1 / channel.rateHz;
  return {
    ...{ channel: channel.name, samples: channel.samples, longestGapS },
    expected: everyS === null || everyS === 0 ? null : (window.toUtcMs - window.fromUtcMs) / 1000 / everyS,
  };
}

/** Channels of the surroundings with samples within the run. */
async function roomChannels(services: Services, run: RunRecord, rows: readonly StepRow[]): Promise<RoomChannel[]> {
  const window = { labId: run.labId, ...windowOf(run, services) };
  const spans = rows.flatMap(({ seq, kind, startUtcMs, endUtcMs }) =>
    kind === 'dwell' && endUtcMs !== null ? [{ seq, fromUtcMs: startUtcMs, toUtcMs: endUtcMs }] : [],
  );
  const channels: RoomChannel[] = [];
  for (const { id, name, unit, role } of await channelsOfRun(services.database.db, run)) {
    if (role !== 'environment') continue;
    const found = await rangeAndMeans(services.database, { ...window, channelId: id }, spans);
    if (found !== null) channels.push({ name, unit, ...found });
  }
  return channels;
}

async function earlierNights(services: Services, run: RunRecord): Promise<MorningNight[]> {
  if (run.rehearsal) return [];
  const nights = await nightsBefore(services.database, {
    labId: run.labId,
    rigId: run.rigId,
    massSetId: run.massSetId,
    startedAtUtcMs: startUtcMsOf(run),
  });
  const control = nights.find((night) => night.control);
  return [...nights.filter((night) => !night.control).slice(0, nightsShown), ...(control === undefined ? [] : [control])];
}
