import type { BuildArchiveInput, FrozenEvaluation } from '@/shared/archive/build-archive';
import type { ChannelSeries } from '@/shared/archive/run-records';
import { findFrozenEvaluation } from '../store/evaluations';
import { channelsOfRun, countSamples, readEvents, readSteps, type RunRecord } from '../store/runs-read';
import { isoOf } from './maker';
import { ProblemError } from './problem-error';
import { softwareVersion } from './software';
import type { Services } from './services';

/** How a run ended, as archives name it. */
function outcomeOf(run: RunRecord): BuildArchiveInput['run']['outcome'] {
  if (run.outcome !== null) return run.outcome;
  return run.state === 'finished' || run.state === 'stopped' ? run.state : 'failed';
}

/** Whether all that a run will ever log is there: an archive of less would not stand. */
export function assertEnded(run: RunRecord): void {
  if (run.endedAt !== null || ['finished', 'stopped', 'failed'].includes(run.state) || (run.rehearsal && run.state === 'held')) return;
  throw new ProblemError('not-possible-now', `The run is ${run.state}. Wait for its end, or stop it.`);
}

/** Channels of a run that have samples within it, with their samples. */
async function seriesOf(services: Services, run: RunRecord): Promise<ChannelSeries[]> {
  const window = { fromUtcMs: run.startedAt ?? run.createdAt, toUtcMs: run.endedAt ?? services.clock.utcMs() };
  const series: ChannelSeries[] = [];
  for (const channel of await channelsOfRun(services.database.db, run)) {
    if ((await countSamples(services.database, { ...window, labId: run.labId, channelId: channel.id })) === 0) continue;
    const { name, quantity, unit, role } = channel;
    series.push({ info: { name, quantity, unit, role }, ...(await services.samples.read(run.labId, channel.id, window)) });
  }
  return series;
}

/** The evaluation frozen last, as the archive holds it. */
async function frozenOf(services: Services, { labId, id }: RunRecord): Promise<FrozenEvaluation | null> {
  const found = await findFrozenEvaluation(services.database.db, labId, id);
  if (found === null || found.result === null || found.frozenAt === null) return null;
  const { result, frozenAt, frozenBy, frozenReason, software, channel } = found;
  return { ...result, frozen: { at: isoOf(frozenAt), by: frozenBy ?? '', reason: frozenReason ?? '', software, channel } };
}

/** Everything of an ended run, as the archive wants it. */
export async function archiveInputOf(services: Services, run: RunRecord): Promise<BuildArchiveInput> {
  const { db } = services.database;
  const { start } = run;
  return {
    run: {
      runId: run.id,
      outcome: outcomeOf(run),
      operator: start.operator,
      startedAtUtcMs: run.startedAt,
      endedAtUtcMs: run.endedAt,
      notes: start.notes,
      massSetLabel: start.massSetLabel,
      simulated: start.simulated,
    },
    rig: start.rig,
    protocol: start.protocol,
    steps: await readSteps(db, { labId: run.labId, runId: run.id }),
    events: await readEvents(db, { labId: run.labId, runId: run.id }, { afterSeq: 0 }),
    channels: await seriesOf(services, run),
    evaluation: await frozenOf(services, run),
    createdAt: isoOf(services.clock.utcMs()),
    software: `Evenfall ${softwareVersion}`,
    title: `${start.protocolName} on ${start.rigName}`,
  };
}
