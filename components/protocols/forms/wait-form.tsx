import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Button, Field, Select } from '@/components/ui';
import { zoneName } from '@/shared/lib/format-time';
import type { WaitStep } from '@/shared/protocol/document';
import type { StepFormProps } from './step-form';

type IfPast = 'continue' | 'hold' | 'next day';

/** Until which time of day in the lab. */
export function WaitForm({ step, onChange, disabled }: StepFormProps<WaitStep>) {
  const { timeZone } = useLab();
  const { until } = step;
  const label = step.label === undefined ? {} : { label: step.label };
  if (!('localTime' in until)) {
    return (
      <View className="gap-3">
        <Body>This step waits for a channel, which this version does not do yet.</Body>
        {disabled ? null : (
          <Button
            label="Wait until 22:00 instead"
            className="self-start"
            onPress={() => onChange({ kind: 'wait', until: { localTime: '22:00' }, ...label })}
          />
        )}
      </View>
    );
  }
  const ifPast: IfPast = until.ifPast ?? 'continue';
  const change = (next: { localTime?: string; ifPast?: IfPast }) => {
    const merged = { localTime: until.localTime, ifPast, ...next };
    onChange({ kind: 'wait', until: merged.ifPast === 'continue' ? { localTime: merged.localTime } : merged, ...label });
  };
  return (
    <View className="gap-4">
      <Field
        label="Until"
        type="time"
        value={until.localTime}
        onChange={(localTime) => (/^\d\d:\d\d$/.test(localTime) ? change({ localTime }) : undefined)}
        hint={`Lab time, ${zoneName(timeZone)}.`}
        disabled={disabled}
        testID="wait-until"
      />
      <Select
        label="If it is past"
        value={ifPast}
        options={[
          { value: 'continue', label: 'go on at once' },
          { value: 'hold', label: 'hold' },
          { value: 'next day', label: 'wait for the next day' },
        ]}
        onChange={(value) => change({ ifPast: value })}
        hint="Past means up to 12 h back when the step begins."
        disabled={disabled}
      />
    </View>
  );
}
