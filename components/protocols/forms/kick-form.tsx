import { View } from 'react-native';
import { Label } from '@/components/ui';
import { formatDuration } from '@/shared/lib/format-duration';
import type { KickStep } from '@/shared/protocol/document';
import { partsDurationS, partsIfPossible } from '@/shared/protocol/step-parts';
import type { RigDocument } from '@/shared/rig/document';
import { NumberField, positive } from './number-field';
import type { StepFormProps } from './step-form';
import { TargetField } from './target-field';

/** How the kick would be made: `2 moves in 3.6 min, then a ring-down of 28 min.` */
function movesWords(step: KickStep, rig: RigDocument | null, fromDeg: number | null): string {
  const parts = rig === null || fromDeg === null ? null : partsIfPossible(step, rig, fromDeg);
  if (parts === null) return '';
  const moves = parts.filter(({ kind }) => kind === 'move');
  const ringDownS = parts.reduce((sum, part) => sum + (part.kind === 'ring-down' ? part.lengthS : 0), 0);
  return ` By plan ${moves.length} moves in ${formatDuration(partsDurationS(parts) - ringDownS)}, then a ring-down of ${formatDuration(ringDownS)}.`;
}

/** How far the pendulum is set swinging, and how long its ring-down is recorded. */
export function KickForm({ step, onChange, rig, fromDeg, disabled }: StepFormProps<KickStep>) {
  const without = (name: 'periods' | 'to') => {
    const rest = { ...step };
    delete rest[name];
    return rest;
  };
  return (
    <View className="gap-4">
      <NumberField
        label="Amplitude"
        unit="µrad"
        value={step.amplitude_urad}
        refuse={positive}
        onChange={(value) => (value === undefined ? undefined : onChange({ ...step, amplitude_urad: value }))}
        disabled={disabled}
        testID="kick-amplitude"
      />
      <NumberField
        label="Ring-down recorded after it"
        unit="T"
        optional
        placeholder="3"
        value={step.periods}
        refuse={positive}
        onChange={(value) => onChange(value === undefined ? without('periods') : { ...step, periods: value })}
        disabled={disabled}
        testID="kick-periods"
      />
      <TargetField
        label="There and back by"
        to={step.to}
        onChange={(to) => onChange({ ...step, to })}
        rig={rig}
        unset={{ label: 'far from near, else near', choose: () => onChange(without('to')) }}
        disabled={disabled}
        testID="kick"
      />
      <Label>
        Sets the pendulum swinging by turning the sources there and back, half a period apart: the ring-down gives period and decay, and is
        no dwell of the series.{movesWords(step, rig, fromDeg)}
      </Label>
    </View>
  );
}
