import { useRouter, type Href } from 'expo-router';
import { View } from 'react-native';
import { FitPlot } from '@/components/charts';
import { Button, Heading, IconButton, Label, Panel } from '@/components/ui';
import type { FitCurve } from '@/shared/evaluation/result';

interface FitPanelProps {
  runId: string;
  curves: readonly FitCurve[];
  selected: number | null;
  onSelect: (seq: number) => void;
}

/** The fit of one dwell, with the way to the one before and after, and to what happened at that time. */
export function FitPanel({ runId, curves, selected, onSelect }: FitPanelProps) {
  const router = useRouter();
  const at = Math.max(
    0,
    curves.findIndex((curve) => curve.seq === selected),
  );
  const curve = curves[at];
  if (!curve) return null;
  const go = (by: number) => {
    const next = curves[at + by];
    if (next) onSelect(next.seq);
  };
  return (
    <Panel className="gap-1" testID="fit-panel">
      <View className="flex-row items-center justify-between gap-2">
        <View className="min-w-0 shrink">
          <Heading level={2}>
            Dwell {curve.seq}, {curve.station}
          </Heading>
          <Label>Points: data in bins. Line: the fit.</Label>
        </View>
        <View className="flex-row">
          <IconButton icon="back" label="Dwell before" onPress={() => go(-1)} disabled={at === 0} />
          <IconButton icon="forward" label="Next dwell" onPress={() => go(1)} disabled={at === curves.length - 1} />
        </View>
      </View>
      <FitPlot curve={curve} />
      <Button
        kind="quiet"
        label="This dwell in the step log"
        onPress={() => router.push(`/runs/${runId}/log?row=${curve.seq}` as Href)}
        className="self-start"
        testID="fit-log"
      />
    </Panel>
  );
}
