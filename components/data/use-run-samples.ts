import { keepPreviousData, useQuery } from '@tanstack/react-query';
import { call, labKey, useLab } from '@/components/api';
import type { TimeSpan } from '@/components/charts/time-plot-types';
import { readSamples } from '@/shared/contracts/data';

const points = 3000;
/** As much again on both sides of what is shown is there already when it is moved to. */
const margin = 0.5;

/** Samples of a channel within a run, thinned by the server to what can be drawn: of the whole run, or about a part of it. */
export function useRunSamples(
  runId: string,
  channelId: string,
  { span = null, enabled = true }: { span?: TimeSpan | null; enabled?: boolean } = {},
) {
  const { labId } = useLab();
  const more = span === null ? 0 : margin * (span.to - span.from);
  const window = span === null ? {} : { fromUtcMs: Math.floor(span.from - more), toUtcMs: Math.ceil(span.to + more) };
  const query = { channelId, points, ...window };
  return useQuery({
    queryKey: [...labKey(labId, readSamples), { runId }, query],
    queryFn: ({ signal }) => call(readSamples, { params: { labId, runId }, query, signal }),
    placeholderData: keepPreviousData,
    staleTime: 30_000,
    enabled,
  });
}
