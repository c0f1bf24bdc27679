import { View } from 'react-native';
import { Field, Label } from '@/components/ui';
import type { Step } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import { DwellForm } from './dwell-form';
import { KickForm } from './kick-form';
import { PromptForm } from './prompt-form';
import { ProofForm } from './proof-form';
import { RepeatForm } from './repeat-form';
import { RotateForm } from './rotate-form';
import { SettleForm } from './settle-form';
import { SwingForm } from './swing-form';
import { WaitForm } from './wait-form';

export interface StepFormProps<S extends Step = Step> {
  step: S;
  onChange: (step: Step) => void;
  rig: RigDocument | null;
  /** Turntable angle when the step begins by plan, deg; null where the plan does not tell. */
  fromDeg: number | null;
  disabled: boolean;
}

/** The fields of one step. */
export function StepForm({ step, onChange, rig, fromDeg, disabled }: StepFormProps) {
  return (
    <View className="gap-5">
      <OwnFields step={step} onChange={onChange} rig={rig} fromDeg={fromDeg} disabled={disabled} />
      <Field
        label={step.kind === 'mark' ? 'Text in the log' : 'Label in the log'}
        value={step.label ?? ''}
        onChange={(label) => onChange(withLabel(step, label))}
        error={step.kind === 'mark' && step.label === '' ? 'a mark needs a text' : undefined}
        placeholder={step.kind === 'mark' ? undefined : 'none'}
        disabled={disabled}
        testID="step-label"
      />
    </View>
  );
}

function OwnFields({ step, onChange, rig, fromDeg, disabled }: StepFormProps) {
  const common = { onChange, rig, fromDeg, disabled };
  switch (step.kind) {
    case 'swing':
      return <SwingForm step={step} {...common} />;
    case 'dwell':
      return <DwellForm step={step} {...common} />;
    case 'kick':
      return <KickForm step={step} {...common} />;
    case 'rotate':
      return <RotateForm step={step} {...common} />;
    case 'settle':
      return <SettleForm step={step} {...common} />;
    case 'wait':
      return <WaitForm step={step} {...common} />;
    case 'repeat':
      return <RepeatForm step={step} {...common} />;
    case 'proof':
      return <ProofForm step={step} {...common} />;
    case 'prompt':
      return <PromptForm step={step} {...common} />;
    case 'home':
      return <Label>Turns slowly to the edge of the home flag; from then on the position is known.</Label>;
    case 'mark':
      return <Label>Takes no time.</Label>;
  }
}

function withLabel(step: Step, label: string): Step {
  if (step.kind === 'mark') return { ...step, label };
  if (label !== '') return { ...step, label };
  const rest = { ...step };
  delete rest.label;
  return rest;
}
