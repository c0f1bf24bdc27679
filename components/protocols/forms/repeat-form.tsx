import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Check, Field, Label, Tabs } from '@/components/ui';
import { zoneName } from '@/shared/lib/format-time';
import type { RepeatStep } from '@/shared/protocol/document';
import { NumberField, positive, wholeFromOne } from './number-field';
import type { StepFormProps } from './step-form';

type Kind = 'times' | 'until' | 'u';

const kindOf = ({ times, until }: RepeatStep): Kind =>
  times !== undefined ? 'times' : until !== undefined && 'localTime' in until ? 'until' : 'u';

/** How often: a number of times, until a time of day in the lab, or until near minus far is known well enough. */
export function RepeatForm({ step, onChange, disabled }: StepFormProps<RepeatStep>) {
  const { timeZone } = useLab();
  const { steps, until } = step;
  const kept = {
    kind: 'repeat',
    steps,
    ...(step.label === undefined ? {} : { label: step.label }),
    ...(step.order === undefined ? {} : { order: step.order }),
  } as const;
  const kind = kindOf(step);
  const choose = (next: Kind) =>
    onChange(
      next === 'times'
        ? { ...kept, times: 8 }
        : next === 'until'
          ? { ...kept, until: { localTime: '06:30' } }
          : { ...kept, until: { relativeStatisticalU: 0.001 }, atLeast: 20, atMost: 40 },
    );
  return (
    <View className="gap-4">
      <Tabs
        label="How often"
        value={kind}
        options={[
          { value: 'times', label: 'Times' },
          { value: 'until', label: 'Until a time' },
          { value: 'u', label: 'Until u' },
        ]}
        onChange={disabled ? () => undefined : choose}
        testID="repeat-kind"
      />
      {step.times === undefined ? null : <TimesFields step={step} onChange={onChange} disabled={disabled} />}
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
      {kind === 'u' ? <UFields step={step} onChange={onChange} disabled={disabled} /> : null}
      <OrderField step={step} onChange={onChange} disabled={disabled} />
    </View>
  );
}

/** Asked only where each child is a repeat, so that what belongs together stays together. */
function OrderField({ step, onChange, disabled }: FieldsProps) {
  const shuffled = step.order === 'shuffled';
  const mayShuffle = step.steps.length > 1 && step.steps.every(({ kind }) => kind === 'repeat');
  if (!shuffled && !mayShuffle) return null;
  return (
    <View className="gap-2">
      <Check
        label="Draw the order of its repeats anew in each pass"
        value={shuffled}
        onChange={(asked) => (disabled ? undefined : onChange(asked ? { ...step, order: 'shuffled' } : without(step, 'order')))}
        testID="repeat-shuffled"
      />
      <Label>
        {mayShuffle
          ? 'From a seed that is drawn at the start and stands in the log. What is shown here is one order of many.'
          : 'Each of its steps must be a repeat to be shuffled.'}
      </Label>
    </View>
  );
}

function without(step: RepeatStep, ...keys: ('counting' | 'atMost' | 'atLeast' | 'order')[]): RepeatStep {
  const rest = { ...step };
  for (const key of keys) delete rest[key];
  return rest;
}

interface FieldsProps {
  step: RepeatStep;
  onChange: (step: RepeatStep) => void;
  disabled: boolean;
}

function TimesFields({ step, onChange, disabled }: FieldsProps) {
  const good = step.counting === 'good';
  const count = (asked: boolean) => {
    const rest = without(step, 'counting', 'atMost');
    const times = step.times ?? 1;
    onChange(asked ? { ...rest, counting: 'good', atMost: times + Math.max(2, Math.ceil(times / 4)) } : rest);
  };
  return (
    <View className="gap-4">
      <NumberField
        label={good ? 'Good passes' : 'Times'}
        value={step.times}
        refuse={wholeFromOne}
        onChange={(times) => (times === undefined ? undefined : onChange({ ...step, times }))}
        disabled={disabled}
        testID="repeat-times"
      />
      <Check
        label="Make up for passes with a dwell that is not good"
        value={good}
        onChange={(asked) => (disabled ? undefined : count(asked))}
        testID="repeat-good"
      />
      {good ? <AtMost step={step} onChange={onChange} disabled={disabled} /> : null}
    </View>
  );
}

function AtMost({ step, onChange, disabled }: FieldsProps) {
  return (
    <NumberField
      label="Passes at most"
      value={step.atMost}
      refuse={wholeFromOne}
      onChange={(atMost) => (atMost === undefined ? undefined : onChange({ ...step, atMost }))}
      disabled={disabled}
      testID="repeat-at-most"
    />
  );
}

function UFields({ step, onChange, disabled }: FieldsProps) {
  const { until } = step;
  const u = until !== undefined && 'relativeStatisticalU' in until ? until.relativeStatisticalU : undefined;
  return (
    <View className="gap-4">
      <NumberField
        label="Relative u of near minus far"
        value={u}
        refuse={positive}
        onChange={(value) => (value === undefined ? undefined : onChange({ ...step, until: { relativeStatisticalU: value } }))}
        disabled={disabled}
        testID="repeat-u"
      />
      <NumberField
        label="Passes at least"
        value={step.atLeast}
        optional
        placeholder="20"
        refuse={wholeFromOne}
        onChange={(atLeast) => {
          const rest = without(step, 'atLeast');
          onChange(atLeast === undefined ? rest : { ...rest, atLeast });
        }}
        disabled={disabled}
      />
      <AtMost step={step} onChange={onChange} disabled={disabled} />
      <Label>
        From the scatter of the good dwells. Fixed beforehand, with its bounds: stopping when a number pleases is no measurement.
      </Label>
    </View>
  );
}
