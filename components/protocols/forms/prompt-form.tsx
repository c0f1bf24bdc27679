import { View } from 'react-native';
import { Check, Field, Label } from '@/components/ui';
import type { PromptStep } from '@/shared/protocol/document';
import { DurationField } from './duration-field';
import { OtherwiseField } from './otherwise-field';
import type { StepFormProps } from './step-form';

/** What somebody has to do before the run goes on. */
export function PromptForm({ step, onChange, disabled }: StepFormProps<PromptStep>) {
  const limit = (asked: boolean) => {
    if (asked) return onChange({ ...step, atMost_s: 1800 });
    const rest = { ...step };
    delete rest.atMost_s;
    onChange(rest);
  };
  return (
    <View className="gap-4">
      <Field
        label="What is to be done"
        value={step.text}
        onChange={(text) => onChange({ ...step, text })}
        error={step.text === '' ? 'a prompt needs a text' : undefined}
        lines={2}
        disabled={disabled}
        testID="prompt-text"
      />
      <Label>It lets people in: the rig is disarmed first. The run goes on when the rig was armed again and somebody has confirmed.</Label>
      <Check
        label="Give up after some time"
        value={step.atMost_s !== undefined}
        onChange={(asked) => (disabled ? undefined : limit(asked))}
      />
      {step.atMost_s === undefined ? null : (
        <>
          <DurationField
            label="Give up after"
            seconds={step.atMost_s}
            onChange={(seconds) => onChange({ ...step, atMost_s: seconds })}
            disabled={disabled}
          />
          <OtherwiseField
            value={step.otherwise ?? 'hold'}
            choices={['hold', 'stop']}
            onChange={(otherwise) => onChange({ ...step, otherwise })}
            disabled={disabled}
          />
        </>
      )}
    </View>
  );
}
