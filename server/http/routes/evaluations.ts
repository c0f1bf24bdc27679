import * as contracts from '@/shared/contracts/evaluations';
import type { EvaluationView, ListedEvaluation } from '@/shared/contracts/evaluations';
import type { Handle } from '@/server/store/database';
import * as store from '@/server/store/evaluations';
import { assertEnded } from '../archive-input';
import { audited } from '../audited';
import { channelToEvaluate } from '../channel-to-evaluate';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { reportInputOf } from '../report-input';
import { mount } from '../route-context';
import { loadRun } from '../run-view';

const listViewOf = (evaluation: store.ListedRecord): ListedEvaluation => ({
  id: evaluation.id,
  runId: evaluation.runId,
  state: evaluation.state,
  createdAt: isoOf(evaluation.createdAt),
  createdBy: evaluation.createdBy,
  channel: evaluation.channel,
  error: evaluation.error,
  result: evaluation.result,
  software: evaluation.software,
  recomputes: evaluation.recomputes,
  frozen:
    evaluation.frozenAt === null
      ? null
      : { at: isoOf(evaluation.frozenAt), by: evaluation.frozenBy ?? '', reason: evaluation.frozenReason ?? '' },
});

const viewOf = (evaluation: store.EvaluationRecord): EvaluationView => ({
  ...listViewOf(evaluation),
  curves: evaluation.curves,
  basis: evaluation.basis,
});

async function loadEvaluation(db: Handle, labId: string, evaluationId: string): Promise<store.EvaluationRecord> {
  const evaluation = await store.findEvaluation(db, labId, evaluationId);
  if (evaluation === null) throw notFound('evaluation');
  return evaluation;
}

/** Why an evaluation cannot be frozen. */
function notToBeFrozen({ recomputes, frozenAt, frozenBy }: store.EvaluationRecord): ProblemError {
  if (recomputes !== null)
    return new ProblemError('not-possible-now', 'It only computes a frozen evaluation again. Evaluate the run anew and freeze that.');
  if (frozenAt !== null)
    return new ProblemError('not-possible-now', `${frozenBy ?? 'Somebody'} froze this evaluation already, at ${isoOf(frozenAt)}.`);
  return new ProblemError('not-possible-now', 'Only an evaluation that came to a result can be frozen.');
}

export const evaluationRoutes = [
  mount(contracts.startEvaluation, async (context) => {
    const { params, body, me, membership, services } = context;
    const run = await loadRun(services, membership.labId, params.runId);
    assertEnded(run);
    const channel = await channelToEvaluate(services, run, body.channel);
    const clock = body.clock === undefined || body.clock.kind === 'estimated' ? null : body.clock;
    const wanted = { labId: run.labId, runId: run.id, channel, clock, createdAt: services.clock.utcMs(), createdBy: me.name };
    const decided = clock === null ? {} : { clock: clock.kind === 'left' ? 'left' : clock.offset_s };
    const data = ({ id }: { id: string }) => ({ runId: run.id, evaluationId: id, channel, ...decided });
    const entry = { kind: 'run.evaluation-asked', data };
    const evaluation = await audited(context, entry, (tx) => store.queueEvaluation(tx, wanted));
    services.pokeJobs();
    return viewOf(evaluation);
  }),

  mount(contracts.listEvaluations, async ({ params, membership, services }) => {
    const run = await loadRun(services, membership.labId, params.runId);
    return { items: (await store.listEvaluations(services.database.db, run.labId, run.id)).map(listViewOf) };
  }),

  mount(contracts.getEvaluation, async ({ params, membership, services }) => {
    return viewOf(await loadEvaluation(services.database.db, membership.labId, params.evaluationId));
  }),

  mount(contracts.freezeEvaluation, async (context) => {
    const { params, body, me, membership, services } = context;
    const which = { labId: membership.labId, evaluationId: params.evaluationId };
    const frozen = { ...which, frozenAt: services.clock.utcMs(), frozenBy: me.name, frozenReason: body.reason };
    const data = ({ id, runId }: store.EvaluationRecord) => ({ runId, evaluationId: id, reason: body.reason });
    const evaluation = await audited(context, { kind: 'run.evaluation-frozen', data }, async (tx) => {
      const done = await store.freezeEvaluation(tx, frozen);
      if (done === null) throw notToBeFrozen(await loadEvaluation(tx, which.labId, which.evaluationId));
      return done;
    });
    return viewOf(evaluation);
  }),

  mount(contracts.recomputeEvaluation, async (context) => {
    const { params, me, membership, services } = context;
    const { labId } = membership;
    const { id, runId, channel, clock, frozenAt } = await loadEvaluation(services.database.db, labId, params.evaluationId);
    if (frozenAt === null)
      throw new ProblemError('not-possible-now', 'This evaluation is not frozen. Freeze it first, or evaluate the run anew.');
    const wanted = { labId, runId, channel, clock, createdAt: services.clock.utcMs(), createdBy: me.name, recomputes: id };
    const data = (made: { id: string }) => ({ runId, evaluationId: made.id, recomputes: id });
    const evaluation = await audited(context, { kind: 'run.evaluation-recomputed', data }, (tx) => store.queueEvaluation(tx, wanted));
    services.pokeJobs();
    return viewOf(evaluation);
  }),

  mount(contracts.downloadReport, async ({ params, membership, services, res }) => {
    const evaluation = await loadEvaluation(services.database.db, membership.labId, params.evaluationId);
    const pdf = await services.tasks.report(await reportInputOf(services, evaluation));
    res.set('Content-Disposition', `attachment; filename="evenfall-report-${evaluation.id.slice(0, 8)}.pdf"`);
    res.type('application/pdf').send(Buffer.from(pdf.buffer, pdf.byteOffset, pdf.byteLength));
    return undefined;
  }),
];
