import type { BuildArchiveInput, FrozenEvaluation } from '@/shared/archive/build-archive';
import type { ChannelSeries } from '@/shared/archive/run-records';
import { wholeFramesOf } from '../store/cameras';
import { findFrozenEvaluation, type ListedRecord } from '../store/evaluations';
import { exclusionsInForce } from '../store/exclusions';
import { channelsOfRun, readEvents, readSteps, type RunRecord } from '../store/runs-read';
import { countSamples } from '../store/sample-summaries';
import { stepNotesOf } from '../store/step-notes';
import { isoOf } from './maker';
import { ProblemError } from './problem-error';
import { calibrationsOfRun } from './run-calibrations';
import { windowOf } from './run-window';
import { softwareVersion } from './software';
import type { Services } from './services';

/** How a run ended, as archives name it. */
export function outcomeOf(run: RunRecord): BuildArchiveInput['run']['outcome'] {
  if (run.outcome !== null) return run.outcome;
  return run.state === 'finished' || run.state === 'stopped' ? run.state : 'failed';
}

/** Whether all that a run will ever log is there: an archive of less would not stand. */
export function assertEnded(run: RunRecord): void {
  if (run.endedAt !== null || ['finished', 'stopped', 'failed'].includes(run.state) || (run.rehearsal && run.state === 'held')) return;
  throw new ProblemError('not-possible-now', `The run is ${run.state}. Wait for its end, or stop it.`);
}

/** Channels of a run that have samples within it, with their samples. */
async function seriesOf(services: Services, run: RunRecord, knownAtUtcMs: number): Promise<ChannelSeries[]> {
  const window = windowOf(run, services);
  const series: ChannelSeries[] = [];
  const channels = await channelsOfRun(services.database.db, run);
  const calibrations = await calibrationsOfRun(services, run, { channels, knownAtUtcMs });
  for (const channel of channels) {
    if ((await countSamples(services.database, { ...window, labId: run.labId, channelId: channel.id })) === 0) continue;
    const { name, quantity, unit, role } = channel;
    const calibration = calibrations.get(channel.id);
    const info = { name, quantity, unit, role, ...(calibration === undefined ? {} : { calibration }) };
    series.push({ info, ...(await services.samples.read(run.labId, channel.id, window)) });
  }
  return series;
}

/** A frozen evaluation as the archive holds it. */
function frozenOf(found: ListedRecord | null): FrozenEvaluation | null {
  if (found === null || found.result === null || found.frozenAt === null) return null;
  const { result, frozenAt, frozenBy, frozenReason, software, channel } = found;
  return { ...result, frozen: { at: isoOf(frozenAt), by: frozenBy ?? '', reason: frozenReason ?? '', software, channel } };
}

/** The stretches excluded at an instant; undefined where there is none, so that the archive has no file of them. */
async function exclusionsAt(services: Services, { labId, id }: RunRecord, utcMs: number): Promise<Pick<BuildArchiveInput, 'exclusions'>> {
  const rows = await exclusionsInForce(services.database.db, { labId, runId: id }, utcMs);
  if (rows.length === 0) return {};
  return { exclusions: rows.map(({ startUtcMs, endUtcMs, reason }) => ({ startUtcMs, endUtcMs, reason })) };
}

/** What was written to the step log; undefined where nothing was, so that the archive has no file of it. */
async function notesOf(services: Services, { labId, id }: RunRecord): Promise<Pick<BuildArchiveInput, 'notes'>> {
  const rows = await stepNotesOf(services.database.db, { labId, runId: id });
  if (rows.length === 0) return {};
  return { notes: rows.map(({ seq, writtenAt, writtenBy, text }) => ({ seq, atUtcMs: writtenAt, by: writtenBy, text })) };
}

/**
 * Everything of an ended run, as the archive wants it. Exclusions and calibrations are those in force at `inForceAtUtcMs`; without it
 * those of the frozen evaluation, so that the archive gives its numbers again, or, where none is frozen, those of now.
 */
export async function archiveInputOf(services: Services, run: RunRecord, inForceAtUtcMs?: number): Promise<BuildArchiveInput> {
  const { db } = services.database;
  const { start } = run;
  const nowUtcMs = services.clock.utcMs();
  const frozen = await findFrozenEvaluation(db, run.labId, run.id);
  const askedAtUtcMs = inForceAtUtcMs ?? frozen?.createdAt ?? nowUtcMs;
  return {
    run: {
      runId: run.id,
      outcome: outcomeOf(run),
      operator: start.operator,
      startedAtUtcMs: run.startedAt,
      endedAtUtcMs: run.endedAt,
      notes: start.notes,
      massSetLabel: start.massSetLabel,
      shuffleSeed: start.shuffleSeed,
      simulated: start.simulated,
    },
    rig: start.rig,
    protocol: start.protocol,
    steps: await readSteps(db, { labId: run.labId, runId: run.id }),
    events: await readEvents(db, { labId: run.labId, runId: run.id }, { afterSeq: 0 }),
    channels: await seriesOf(services, run, askedAtUtcMs),
    ...(await exclusionsAt(services, run, askedAtUtcMs)),
    ...(await notesOf(services, run)),
    evaluation: frozenOf(frozen),
    createdAt: isoOf(nowUtcMs),
    software: `Evenfall ${softwareVersion}`,
    title: `${start.protocolName} on ${start.rigName}`,
  };
}

/** The camera frames of a run, for its archive alone; undefined where there are none. */
export async function archivedFramesOf(services: Services, { labId, id }: RunRecord): Promise<Pick<BuildArchiveInput, 'frames'>> {
  const rows = await wholeFramesOf(services.database.db, { labId, runId: id });
  if (rows.length === 0) return {};
  return {
    frames: rows.map(({ seq, moment, at, cameraName, takenAt, uTakenS, type, bytes, note }) => {
      const whole = bytes !== null && type !== null && takenAt !== null && uTakenS !== null;
      const picture = whole ? { bytes, type, takenUtcMs: takenAt, uTakenS } : null;
      return { seq, moment, atUtcMs: at, camera: cameraName, picture, note: note ?? '' };
    }),
  };
}
