import { View } from 'react-native';
import { useConnection, useLab } from '@/components/api';
import { stagesOf } from '@/components/runs/intervention';
import { InterventionStages } from '@/components/runs/intervention-stages';
import { Button, Label } from '@/components/ui';
import type { LineMessage } from '@/shared/contracts/link';
import { useHalt } from './use-halt';

/** Hold and Stop of the turntable, always in the same place and always enabled: neither needs an arm, a session or a run. */
export function HaltBar({ rigId, line }: { rigId: string; line: LineMessage | null }) {
  const { timeZone } = useLab();
  const { online } = useConnection();
  const { local, tap } = useHalt(rigId);
  const halt = line?.halt ?? null;
  const since = line?.guided?.since ?? null;
  // A halt from before this guided move is history.
  const known = halt === null || (since !== null && halt.serverAt < since) ? null : halt;
  const stages = stagesOf(local, known, known?.kind === 'stop' ? 'stopped' : 'held');
  const order = line?.guided?.order ?? null;
  // So is one from before a newer order.
  const over = known !== null && order !== null && order.at > known.serverAt && local.kind !== 'sending';
  return (
    <View className="gap-3" testID="halt-bar">
      {stages === null || over ? null : <InterventionStages stages={stages} timeZone={timeZone} />}
      {online ? null : (
        <Label tone="danger" role="alert">
          The server does not answer. If anything moves, use the switch at the rig.
        </Label>
      )}
      <View className="flex-row gap-4">
        <Button className="min-w-0 flex-1" size="action" icon="hold" label="Hold" testID="hold" onPress={() => tap('hold')} />
        <Button
          className="min-w-[56%] flex-none"
          size="action"
          kind="danger"
          icon="stop"
          label="Stop"
          testID="stop"
          onPress={() => tap('stop')}
        />
      </View>
      <Label className="text-center">This is no emergency stop. The hard-wired one is at the rig.</Label>
    </View>
  );
}
