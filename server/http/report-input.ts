import type { ReportInput } from '../interfaces/report';
import type { EvaluationRecord } from '../store/evaluations';
import { exclusionsInForce } from '../store/exclusions';
import { readEvents, readSteps } from '../store/runs-read';
import { isoOf } from './maker';
import { ProblemError } from './problem-error';
import { loadRun } from './run-view';
import type { Services } from './services';

/** What the report of an evaluation tells; one without a G would tell nothing. */
export async function reportInputOf(services: Services, evaluation: EvaluationRecord): Promise<ReportInput> {
  const { labId, runId, result, frozenAt } = evaluation;
  if (result === null || result.G === null)
    throw new ProblemError('not-possible-now', 'A report needs an evaluation that came to a G. This one has none.');
  const { db } = services.database;
  const run = await loadRun(services, labId, runId);
  const { start } = run;
  return {
    run: {
      id: run.id,
      rigName: start.rigName,
      rigRevision: start.rigRevision,
      protocolName: start.protocolName,
      protocolRevision: start.protocolRevision,
      massSet: start.massSetLabel,
      operator: start.operator,
      rehearsal: run.rehearsal,
      startedAtUtcMs: run.startedAt,
      endedAtUtcMs: run.endedAt,
    },
    rig: start.rig,
    evaluation: {
      id: evaluation.id,
      at: isoOf(evaluation.createdAt),
      by: evaluation.createdBy,
      channel: evaluation.channel,
      software: evaluation.software,
    },
    frozen: frozenAt === null ? null : { at: isoOf(frozenAt), by: evaluation.frozenBy ?? '', reason: evaluation.frozenReason ?? '' },
    result,
    curves: evaluation.curves ?? [],
    steps: await readSteps(db, { labId, runId }),
    excluded: (await exclusionsInForce(db, { labId, runId }, evaluation.createdAt)).map(({ startUtcMs, endUtcMs, madeBy, reason }) => ({
      startUtcMs,
      endUtcMs,
      by: madeBy,
      reason,
    })),
    chainHead: (await readEvents(db, { labId, runId }, { afterSeq: 0 })).at(-1)?.hash ?? null,
  };
}
