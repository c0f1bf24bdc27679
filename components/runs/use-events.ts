import { useQuery } from '@tanstack/react-query';
import { call, labKey, useLab } from '@/components/api';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { listEvents } from '@/shared/contracts/runs';

const pageSize = 500;
const mostPages = 40;

/** The whole event chain of a run, page by page. */
export function useEvents(runId: string, live: boolean) {
  const { labId } = useLab();
  return useQuery({
    queryKey: labKey(labId, listEvents, { params: { runId } }),
    queryFn: async ({ signal }) => {
      const events: ChainedEvent[] = [];
      let cursor: string | null = null;
      for (let page = 0; page < mostPages; page += 1) {
        const query: { limit: number; cursor?: string } = cursor === null ? { limit: pageSize } : { limit: pageSize, cursor };
        const { data } = await call(listEvents, { params: { labId, runId }, query, signal });
        events.push(...data.items);
        cursor = data.next;
        if (cursor === null) break;
      }
      return events.sort((a, b) => a.seq - b.seq);
    },
    refetchInterval: live ? 10_000 : false,
  });
}

/** Events that name the step, and those without a step that came between its start and its end; the last step keeps what came after it. */
export function eventsOf(
  events: readonly ChainedEvent[],
  row: { seq: number; startUtcMs: number; endUtcMs: number | null },
): ChainedEvent[] {
  return events.filter((event) => {
    const named = event.data['seq'];
    if (typeof named === 'number') return named === row.seq;
    const at = Date.parse(event.at);
    return at >= row.startUtcMs - 1 && (row.endUtcMs === null || at < row.endUtcMs);
  });
}
