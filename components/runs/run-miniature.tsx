import { useMemo } from 'react';
import { View } from 'react-native';
import { useLabQuery } from '@/components/api';
import { stepsOfLog, SwingStrip } from '@/components/charts';
import { readSamples } from '@/shared/contracts/data';
import { listSteps, type RunSummary } from '@/shared/contracts/runs';

/** The night of a run on one line. The room is kept while it loads, so that the list does not jump. */
export function RunMiniature({ run, timeZone }: { run: RunSummary; timeZone: string }) {
  const steps = useLabQuery(listSteps, { params: { runId: run.id } });
  const samples = useLabQuery(readSamples, { params: { runId: run.id }, query: { points: 300 } });
  const rows = steps.data?.data.items;
  const strip = useMemo(() => stepsOfLog(rows ?? []), [rows]);
  const data = samples.data?.data;
  const measured = useMemo(() => (data && data.utcMs.length > 0 ? { x: data.utcMs, y: data.value } : null), [data]);
  return (
    <View style={{ height: 40 }}>
      {strip.length === 0 ? null : (
        <SwingStrip
          steps={strip}
          timeZone={timeZone}
          title={`${run.rigName}, ${run.protocolName}`}
          size="mini"
          heightPx={40}
          measured={measured}
        />
      )}
    </View>
  );
}
