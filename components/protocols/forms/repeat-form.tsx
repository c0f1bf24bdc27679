import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Button, Field, Tabs } from '@/components/ui';
import { zoneName } from '@/shared/lib/format-time';
import type { RepeatStep } from '@/shared/protocol/document';
import { NumberField, wholeFromOne } from './number-field';
import type { StepFormProps } from './step-form';

/** How often: a number of times, or until a time of day in the lab. */
export function RepeatForm({ step, onChange, disabled }: StepFormProps<RepeatStep>) {
  const { timeZone } = useLab();
  const { steps, until } = step;
  const kept = { kind: 'repeat', steps, ...(step.label === undefined ? {} : { label: step.label }) } as const;
  const unbuilt =
    (until !== undefined && !('localTime' in until)) ||
    step.counting === 'good' ||
    step.order === 'shuffled' ||
    step.atLeast !== undefined ||
    step.atMost !== undefined;
  const choose = (kind: 'times' | 'until') =>
    onChange(kind === 'times' ? { ...kept, times: 8 } : { ...kept, until: { localTime: '06:30' } });
  return (
    <View className="gap-4">
      {unbuilt ? (
        <View className="gap-3">
          <Body>This repeat ends by a condition that this version does not carry out yet.</Body>
          {disabled ? null : <Button label="Make it a plain repeat" className="self-start" onPress={() => choose('times')} />}
        </View>
      ) : null}
      <Tabs
        label="How often"
        value={step.times === undefined ? 'until' : 'times'}
        options={[
          { value: 'times', label: 'A number of times' },
          { value: 'until', label: 'Until a time' },
        ]}
        onChange={disabled ? () => undefined : choose}
        testID="repeat-kind"
      />
      {step.times === undefined ? null : (
        <NumberField
          label="Times"
          value={step.times}
          refuse={wholeFromOne}
          onChange={(times) => (times === undefined ? undefined : onChange({ ...step, times }))}
          disabled={disabled}
          testID="repeat-times"
        />
      )}
      {until !== undefined && 'localTime' in until ? (
        <Field
          label="Until"
          type="time"
          value={until.localTime}
          onChange={(localTime) => (/^\d\d:\d\d$/.test(localTime) ? onChange({ ...step, until: { localTime } }) : undefined)}
          hint={`Lab time, ${zoneName(timeZone)}. A pass starts only if it is planned to end by then.`}
          disabled={disabled}
          testID="repeat-until"
        />
      ) : null}
    </View>
  );
}
