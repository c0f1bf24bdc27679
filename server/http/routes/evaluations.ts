import * as contracts from '@/shared/contracts/evaluations';
import type { EvaluationView } from '@/shared/contracts/evaluations';
import * as store from '@/server/store/evaluations';
import { channelsOfRun, countSamples, findRun, type RunRecord } from '@/server/store/runs-read';
import { assertEnded } from '../archive-input';
import { audited } from '../audited';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import type { Services } from '../services';

const listViewOf = (evaluation: Omit<store.EvaluationRecord, 'curves'>): Omit<EvaluationView, 'curves'> => ({
  id: evaluation.id,
  runId: evaluation.runId,
  state: evaluation.state,
  createdAt: isoOf(evaluation.createdAt),
  createdBy: evaluation.createdBy,
  channel: evaluation.channel,
  error: evaluation.error,
  result: evaluation.result,
});

const viewOf = (evaluation: store.EvaluationRecord): EvaluationView => ({ ...listViewOf(evaluation), curves: evaluation.curves });

async function loadRun(services: Services, labId: string, runId: string): Promise<RunRecord> {
  const run = await findRun(services.database.db, labId, runId);
  if (run === null) throw notFound('run');
  return run;
}

/** Name of the channel to evaluate: the one asked for, the registered one, or the only deflection channel with data. */
async function channelToEvaluate(services: Services, run: RunRecord, asked: string | undefined): Promise<string> {
  const window = { fromUtcMs: run.startedAt ?? run.createdAt, toUtcMs: run.endedAt ?? services.clock.utcMs() };
  const filled: string[] = [];
  for (const channel of await channelsOfRun(services.database.db, run)) {
    if (channel.role !== 'deflection') continue;
    if ((await countSamples(services.database, { ...window, labId: run.labId, channelId: channel.id })) > 0) filled.push(channel.name);
  }
  const wanted = asked ?? run.start.protocol.evaluation?.channel;
  if (wanted !== undefined) {
    if (filled.includes(wanted)) return wanted;
    const there = filled.length === 0 ? 'no deflection channel has any' : `these have: ${filled.join(', ')}`;
    throw new ProblemError('cannot-evaluate', `The channel "${wanted}" has no deflection within this run; ${there}.`, [
      { path: 'channel', message: 'a deflection channel with data' },
    ]);
  }
  const [only, second] = filled;
  if (only === undefined)
    throw new ProblemError('cannot-evaluate', 'No deflection lies within this run. Bring the file of the readout in first.');
  if (second !== undefined)
    throw new ProblemError('cannot-evaluate', `More than one channel has deflection within this run: ${filled.join(', ')}. Choose one.`, [
      { path: 'channel', message: `one of ${filled.join(', ')}` },
    ]);
  return only;
}

export const evaluationRoutes = [
  mount(contracts.startEvaluation, async (context) => {
    const { params, body, me, membership, services } = context;
    const run = await loadRun(services, membership.labId, params.runId);
    assertEnded(run);
    const channel = await channelToEvaluate(services, run, body.channel);
    const wanted = { labId: run.labId, runId: run.id, channel, createdAt: services.clock.utcMs(), createdBy: me.name };
    const entry = { kind: 'run.evaluation-asked', data: ({ id }: { id: string }) => ({ runId: run.id, evaluationId: id, channel }) };
    const evaluation = await audited(context, entry, (tx) => store.queueEvaluation(tx, wanted));
    services.pokeJobs();
    return viewOf(evaluation);
  }),

  mount(contracts.listEvaluations, async ({ params, membership, services }) => {
    const run = await loadRun(services, membership.labId, params.runId);
    return { items: (await store.listEvaluations(services.database.db, run.labId, run.id)).map(listViewOf) };
  }),

  mount(contracts.getEvaluation, async ({ params, membership, services }) => {
    const evaluation = await store.findEvaluation(services.database.db, membership.labId, params.evaluationId);
    if (evaluation === null) throw notFound('evaluation');
    return viewOf(evaluation);
  }),
];
