import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Field, Select, Tabs } from '@/components/ui';
import { zoneName } from '@/shared/lib/format-time';
import type { WaitStep } from '@/shared/protocol/document';
import { isChannelWait, waitOf, type ChannelStep } from '@/shared/protocol/wait';
import { DurationField } from './duration-field';
import { NumberField, positive } from './number-field';
import { OtherwiseField } from './otherwise-field';
import type { StepFormProps } from './step-form';

type IfPast = 'continue' | 'hold' | 'next day';

/** Until which time of day in the lab, or until a channel is quiet. */
export function WaitForm(props: StepFormProps<WaitStep>) {
  const { step, onChange, disabled } = props;
  const label = step.label === undefined ? {} : { label: step.label };
  const choose = (kind: 'time' | 'channel') =>
    onChange(
      kind === 'time'
        ? { kind: 'wait', until: { localTime: '22:00' }, ...label }
        : { kind: 'wait', until: { channel: 'box temperature', slopeBelow_per_h: 0.3, for_s: 600 }, otherwise: 'continue', ...label },
    );
  return (
    <View className="gap-4">
      <Tabs
        label="Until when"
        value={isChannelWait(step) ? 'channel' : 'time'}
        options={[
          { value: 'time', label: 'A time of day' },
          { value: 'channel', label: 'A quiet channel' },
        ]}
        onChange={disabled ? () => undefined : choose}
        testID="wait-kind"
      />
      {isChannelWait(step) ? <ChannelFields step={step} onChange={onChange} disabled={disabled} /> : <TimeFields {...props} />}
    </View>
  );
}

function ChannelFields({ step, onChange, disabled }: { step: ChannelStep; onChange: (step: WaitStep) => void; disabled: boolean }) {
  const { until } = step;
  const wait = waitOf(step);
  const bySlope = until.slopeBelow_per_h !== undefined;
  const limit = (slope: boolean, value: number) => {
    const { channel, for_s: forS } = until;
    const kept = { channel, ...(forS === undefined ? {} : { for_s: forS }) };
    onChange({ ...step, until: slope ? { ...kept, slopeBelow_per_h: value } : { ...kept, below: value } });
  };
  return (
    <View className="gap-4">
      <Field
        label="Channel"
        value={until.channel}
        onChange={(channel) => onChange({ ...step, until: { ...until, channel } })}
        error={until.channel === '' ? 'the name of a channel of the rig' : undefined}
        disabled={disabled}
        testID="wait-channel"
      />
      <Tabs
        label="What has to be small"
        value={bySlope ? 'slope' : 'value'}
        options={[
          { value: 'slope', label: 'Its slope' },
          { value: 'value', label: 'Its value' },
        ]}
        onChange={(kind) => (disabled ? undefined : limit(kind === 'slope', until.slopeBelow_per_h ?? until.below ?? 1))}
      />
      <NumberField
        label={bySlope ? 'Slope below, in the unit of the channel an hour' : 'Below, in the unit of the channel'}
        value={bySlope ? until.slopeBelow_per_h : until.below}
        onChange={(value) => (value === undefined ? undefined : limit(bySlope, value))}
        disabled={disabled}
        testID="wait-limit"
        {...(bySlope ? { refuse: positive } : {})}
      />
      <DurationField
        label="For"
        seconds={wait?.windowS ?? 60}
        onChange={(seconds) => onChange({ ...step, until: { ...until, for_s: seconds } })}
        disabled={disabled}
      />
      <DurationField
        label="Give up after"
        seconds={wait?.atMostS ?? 5400}
        onChange={(seconds) => onChange({ ...step, atMost_s: seconds })}
        disabled={disabled}
      />
      <OtherwiseField
        value={step.otherwise ?? 'hold'}
        choices={['hold', 'continue', 'stop']}
        onChange={(otherwise) => onChange({ ...step, otherwise })}
        disabled={disabled}
      />
    </View>
  );
}

function TimeFields({ step, onChange, disabled }: StepFormProps<WaitStep>) {
  const { timeZone } = useLab();
  const { until } = step;
  const label = step.label === undefined ? {} : { label: step.label };
  if (!('localTime' in until)) return null;
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
