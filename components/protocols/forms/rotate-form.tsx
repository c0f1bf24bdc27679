import { View } from 'react-native';
import { Label } from '@/components/ui';
import { formatDuration } from '@/shared/lib/format-duration';
import type { RotateStep } from '@/shared/protocol/document';
import { partsDurationS, partsIfPossible } from '@/shared/protocol/step-parts';
import type { RigDocument } from '@/shared/rig/document';
import { freeTurns } from '@/shared/rig/travel';
import { DurationField } from './duration-field';
import { NumberField } from './number-field';
import type { StepFormProps } from './step-form';

const wholeTurns = (value: number): string | undefined =>
  Number.isInteger(value) && value !== 0 ? undefined : 'a whole number of turns, negative clockwise';

/** `Out 1 h 30 min, back 3 min.` */
function lengthWords(step: RotateStep, rig: RigDocument | null, fromDeg: number | null): string {
  const parts = rig === null ? null : partsIfPossible(step, rig, fromDeg ?? rig.motion?.homeDeg ?? 0);
  const out = parts?.[0];
  if (parts === null || out?.kind !== 'move') return '';
  return ` By plan out ${formatDuration(out.durationS)}, back ${formatDuration(partsDurationS(parts) - out.durationS)}.`;
}

function turnsHint(rig: RigDocument | null): string | undefined {
  if (rig?.motion === undefined) return undefined;
  const most = freeTurns(rig.motion);
  if (most > 0) return `The cables of this rig stand ${most} either way.`;
  const { keepOut = [] } = rig.motion;
  return keepOut.length > 0
    ? 'This rig has keep-out arcs, so it makes no whole turn.'
    : 'This rig does not say how many turns its cables stand: motion.turnsLimit.';
}

/** How fast and how many turns. */
export function RotateForm({ step, onChange, rig, fromDeg, disabled }: StepFormProps<RotateStep>) {
  return (
    <View className="gap-4">
      <NumberField
        label="Turns, positive counter-clockwise"
        value={step.turns}
        refuse={wholeTurns}
        hint={turnsHint(rig)}
        onChange={(turns) => (turns === undefined ? undefined : onChange({ ...step, turns }))}
        disabled={disabled}
        testID="rotate-turns"
      />
      <DurationField
        label="Time of a turn"
        seconds={step.period_s}
        onChange={(period_s) => onChange({ ...step, period_s })}
        disabled={disabled}
        testID="rotate-period"
      />
      <Label>
        Turns at a constant rate, and back again as fast as the rig turns, so that the cables are free. The way out is evaluated by the
        modulation method; at four of the pendulum’s periods for a turn and more it hangs least on the decay.
        {lengthWords(step, rig, fromDeg)}
      </Label>
    </View>
  );
}
