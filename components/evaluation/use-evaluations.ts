import { useQueryClient } from '@tanstack/react-query';
import { labKey, useLab, useLabMutation, useLabQuery } from '@/components/api';
import { getEvaluation, listEvaluations, startEvaluation, type ListedEvaluation } from '@/shared/contracts/evaluations';

const pollMs = 1000;
/** A run that is over is evaluated by the server itself, minutes later. */
const firstPollMs = 4000;

export const atWork = (state: string | undefined) => state === 'queued' || state === 'running';

/** The newest evaluation of a run, asked for again while it is at work, and the way to start one. */
export function useEvaluations(runId: string) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const first = useLabQuery(listEvaluations, { params: { runId } });
  const busy = first.data?.data.items.some(({ state }) => atWork(state)) ?? false;
  const none = first.data?.data.items.length === 0;
  const list = useLabQuery(listEvaluations, { params: { runId }, ...(busy ? { everyMs: pollMs } : none ? { everyMs: firstPollMs } : {}) });
  const refresh = () => void queries.invalidateQueries({ queryKey: labKey(labId, listEvaluations) });
  const start = useLabMutation(startEvaluation, refresh);
  const items = list.data?.data.items ?? [];
  const own = items.filter(({ recomputes }) => recomputes === null);
  const newest = own[0] ?? null;
  const allDone = own.filter(({ state, result }) => state === 'done' && result !== null);
  return {
    list,
    refresh,
    newest,
    /** The newest that came to a result. */
    done: allDone[0] ?? null,
    /** All that came to a result, newest first, without those that only compute a frozen one again. */
    allDone,
    /** The newest recomputation of a frozen evaluation. */
    recomputationOf: (id: string): ListedEvaluation | null => items.find(({ recomputes }) => recomputes === id) ?? null,
    busy: atWork(newest?.state) || start.isPending,
    startError: start.error,
    start: (channel?: string) => start.mutate({ params: { runId }, body: channel === undefined ? {} : { channel } }),
  };
}

/** One evaluation with its fitted curves. */
export function useEvaluation(evaluationId: string | null) {
  return useLabQuery(getEvaluation, { params: { evaluationId: evaluationId ?? '' }, enabled: evaluationId !== null });
}
