import { useQueryClient } from '@tanstack/react-query';
import { labKey, serverNowMs, useLab, useLabMutation, useLabQuery } from '@/components/api';
import { getEvaluation, listEvaluations, startEvaluation, type ListedEvaluation } from '@/shared/contracts/evaluations';
import type { ClockChoice } from '@/shared/evaluation/clock-choice';

const pollMs = 1000;
/** A run that is over is evaluated by the server itself, minutes later: so often and so long after its end the first is looked for. */
const firstPollMs = 4000;
const firstWithinMs = 600_000;

export const atWork = (state: string | undefined) => state === 'queued' || state === 'running';

/** The newest evaluation of a run, asked for again while it is at work or soon to be, and the way to start one. */
export function useEvaluations(runId: string, endedAt: string | null) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const justEnded = () => endedAt !== null && serverNowMs() - Date.parse(endedAt) < firstWithinMs;
  const list = useLabQuery(listEvaluations, {
    params: { runId },
    everyMs: (answer) => {
      const items = answer?.data.items ?? [];
      if (items.some(({ state }) => atWork(state))) return pollMs;
      return items.length === 0 && justEnded() ? firstPollMs : false;
    },
  });
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
    start: (choice: { channel?: string | undefined; clock?: ClockChoice | undefined }) => start.mutate({ params: { runId }, body: choice }),
  };
}

/** One evaluation with its fitted curves. */
export function useEvaluation(evaluationId: string | null) {
  return useLabQuery(getEvaluation, { params: { evaluationId: evaluationId ?? '' }, enabled: evaluationId !== null });
}
