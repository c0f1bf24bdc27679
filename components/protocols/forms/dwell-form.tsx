import { View } from 'react-native';
import { Label, Tabs } from '@/components/ui';
import type { DwellStep } from '@/shared/protocol/document';
import { DurationField } from './duration-field';
import { NumberField, positive } from './number-field';
import type { StepFormProps } from './step-form';

type Length = 'beat_periods' | 'periods' | 'for_s';

const lengthOf = (step: DwellStep): Length =>
  step.beat_periods !== undefined ? 'beat_periods' : step.periods !== undefined ? 'periods' : 'for_s';

const uses: Record<Length, string> = {
  beat_periods: 'Ends so many periods after the start of the swing before it: the cadence is exact. It must directly follow a swing.',
  periods: 'Lasts so many periods from its own start.',
  for_s: 'Lasts a fixed time.',
};

/** How long the sources stand still. */
export function DwellForm({ step, onChange, rig, disabled }: StepFormProps<DwellStep>) {
  const length = lengthOf(step);
  const periodS = rig?.measured?.period_s?.value;
  const label = step.label === undefined ? {} : { label: step.label };
  const choose = (next: Length) => {
    const seconds = step.for_s ?? (step.periods ?? step.beat_periods ?? 2) * (periodS ?? 450);
    const periods = step.periods ?? step.beat_periods ?? (periodS === undefined ? 2 : Math.max(1, Math.round(seconds / periodS)));
    onChange({ kind: 'dwell', ...(next === 'for_s' ? { for_s: Math.round(seconds) } : { [next]: periods }), ...label });
  };
  const periods = step.beat_periods ?? step.periods;
  return (
    <View className="gap-4">
      <Tabs
        label="Length"
        value={length}
        options={[
          { value: 'beat_periods', label: 'Beat' },
          { value: 'periods', label: 'Periods' },
          { value: 'for_s', label: 'Time' },
        ]}
        onChange={disabled ? () => undefined : choose}
        testID="dwell-length"
      />
      <Label>{uses[length]}</Label>
      {length === 'for_s' ? (
        <DurationField
          label="Time"
          seconds={step.for_s ?? 0}
          onChange={(seconds) => onChange({ kind: 'dwell', for_s: seconds, ...label })}
          disabled={disabled}
          testID="dwell-time"
        />
      ) : (
        <NumberField
          label={length === 'beat_periods' ? 'Beat' : 'Periods'}
          unit="T"
          value={periods}
          refuse={positive}
          onChange={(value) => (value === undefined ? undefined : onChange({ kind: 'dwell', [length]: value, ...label }))}
          hint={
            periodS === undefined
              ? 'The rig has no measured period yet; a fixed time works without one.'
              : `T is ${periodS} s on this rig. Whole periods keep the pendulum from being rung up.`
          }
          disabled={disabled}
          testID="dwell-periods"
        />
      )}
    </View>
  );
}
