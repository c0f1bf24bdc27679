import { View } from 'react-native';
import { Body, Button, Label } from '@/components/ui';
import type { SettleStep } from '@/shared/protocol/document';
import { DurationField } from './duration-field';
import type { StepFormProps } from './step-form';

/** How long to wait for creep and heat. */
export function SettleForm({ step, onChange, disabled }: StepFormProps<SettleStep>) {
  const label = step.label === undefined ? {} : { label: step.label };
  if (step.for_s === undefined) {
    return (
      <View className="gap-3">
        <Body>This step waits until it is calm, which this version does not do yet.</Body>
        {disabled ? null : (
          <Button label="Wait 10 min instead" className="self-start" onPress={() => onChange({ kind: 'settle', for_s: 600, ...label })} />
        )}
      </View>
    );
  }
  return (
    <View className="gap-4">
      <DurationField
        label="Time"
        seconds={step.for_s}
        onChange={(seconds) => onChange({ kind: 'settle', for_s: seconds, ...label })}
        disabled={disabled}
        testID="settle-time"
      />
      <Label>For creep and heat after loading or touching, not against ringing: whole periods from swing to swing do that better.</Label>
    </View>
  );
}
