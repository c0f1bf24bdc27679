import { useQueryClient } from '@tanstack/react-query';
import { labKey, useLab, useLabMutation, useLabQuery } from '@/components/api';
import { getEvaluation, listEvaluations, startEvaluation } from '@/shared/contracts/evaluations';

const pollMs = 1000;

const atWork = (state: string | undefined) => state === 'queued' || state === 'running';

/** The newest evaluation of a run, asked for again while it is at work, and the way to start one. */
export function useEvaluations(runId: string) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const first = useLabQuery(listEvaluations, { params: { runId } });
  const busy = atWork(first.data?.data.items[0]?.state);
  const list = useLabQuery(listEvaluations, { params: { runId }, ...(busy ? { everyMs: pollMs } : {}) });
  const start = useLabMutation(startEvaluation, () => void queries.invalidateQueries({ queryKey: labKey(labId, listEvaluations) }));
  const items = list.data?.data.items ?? [];
  return {
    list,
    newest: items[0] ?? null,
    /** The newest that came to a result. */
    done: items.find((item) => item.state === 'done' && item.result !== null) ?? null,
    busy: busy || start.isPending,
    startError: start.error,
    start: (channel?: string) => start.mutate({ params: { runId }, body: channel === undefined ? {} : { channel } }),
  };
}

/** One evaluation with its fitted curves. */
export function useEvaluation(evaluationId: string | null) {
  return useLabQuery(getEvaluation, { params: { evaluationId: evaluationId ?? '' }, enabled: evaluationId !== null });
}
