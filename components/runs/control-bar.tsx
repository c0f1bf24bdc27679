import { View } from 'react-native';
import { useConnection } from '@/components/api';
import { Button, Label } from '@/components/ui';
import type { RunView } from '@/shared/contracts/runs';
import { stagesOf, type LocalIntervention, type SafeAct } from './intervention';
import { InterventionStages } from './intervention-stages';

interface ControlBarProps {
  view: Pick<RunView, 'state' | 'intervention'>;
  local: LocalIntervention;
  onTap: (act: SafeAct) => void;
  timeZone: string;
}

/**
 * Hold and Stop run, always in the same place: what is said about them grows upwards, above the buttons. Stop stays
 * enabled whatever happens; it needs no confirmation, because it is the safe direction.
 */
export function ControlBar({ view, local, onTap, timeZone }: ControlBarProps) {
  const { online } = useConnection();
  const stages = stagesOf(local, view.intervention, view.state);
  const holding = view.state === 'holding' || view.state === 'held';
  const stopSent = stages?.act === 'stop' && stages.server.state !== 'failed';
  return (
    <View className="gap-3" testID="control-bar">
      {stages === null ? null : <InterventionStages stages={stages} timeZone={timeZone} />}
      {online || stages?.sentence ? null : (
        <Label tone="danger" role="alert">
          Stop is sent as soon as the server answers, for 30 s. If it cannot be reached, use the switch at the rig.
        </Label>
      )}
      <View className="flex-row gap-4">
        <Button
          className="min-w-0 flex-1"
          size="action"
          icon="hold"
          testID="hold"
          label={view.state === 'held' ? 'Held' : 'Hold'}
          accessibilityLabel={view.state === 'held' ? 'Held' : 'Hold the run'}
          disabled={holding || view.state === 'stopping' || stopSent}
          onPress={() => onTap('hold')}
        />
        <Button
          className="min-w-[56%] flex-none"
          size="action"
          kind="danger"
          icon="stop"
          testID="stop"
          label="Stop run"
          onPress={() => onTap('stop')}
        />
      </View>
      <Label className="text-center">This is no emergency stop. The hard-wired one is at the rig.</Label>
    </View>
  );
}
