import { Link, type Href } from 'expo-router';
import { View } from 'react-native';
import { Body, Icon, Label } from '@/components/ui';
import type { RigView } from '@/shared/contracts/rigs';

/** Leads to the run that this rig is carrying out. */
export function RunningNow({ rig }: { rig: RigView }) {
  if (rig.activeRun === null) return null;
  return (
    <Link
      href={`/runs/${rig.activeRun.id}` as Href}
      testID="running-now"
      className="min-h-action rounded-panel border-2 border-lamp bg-panel px-4 py-3"
      style={{ display: 'flex', alignItems: 'center', gap: 12 }}
    >
      <Icon name="start" tone="lamp" />
      <View className="flex-1">
        <Body strong>{rig.activeRun.protocolName}</Body>
        <Label>{rig.activeRun.state}: watch, hold or stop</Label>
      </View>
      <Icon name="forward" tone="dim" />
    </Link>
  );
}
