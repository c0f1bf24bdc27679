import { View } from 'react-native';
import { Check, Label } from '@/components/ui';
import type { ProofStep } from '@/shared/protocol/document';
import { NumberField, positive } from './number-field';
import { OtherwiseField } from './otherwise-field';
import type { StepFormProps } from './step-form';

interface Bound {
  key: 'size' | 'period' | 'residual' | 'edge_deg';
  label: string;
  usual: number;
  unit?: string;
}

const bounds: readonly Bound[] = [
  { key: 'size', label: 'Size of near minus far, share off', usual: 0.2 },
  { key: 'period', label: 'Period, share off', usual: 0.03 },
  { key: 'residual', label: 'Noise about the fit, times that of the rig', usual: 3 },
  { key: 'edge_deg', label: 'Shift of the home edge', usual: 0.02, unit: '°' },
];

/** What the last near and the last far dwell have to show for the night to be worth running. */
export function ProofForm({ step, onChange, disabled }: StepFormProps<ProofStep>) {
  const put = (key: Bound['key'] | 'sign', value: number | boolean | null) => onChange({ ...step, [key]: value });
  return (
    <View className="gap-4">
      <Label>
        Compares the last near and the last far dwell with the plan, at once: a proof after the first pair tells while somebody is still
        awake.
      </Label>
      <Check
        label="Near and far on their right sides"
        value={step.sign !== null && step.sign !== false}
        onChange={(asked) => (disabled ? undefined : put('sign', asked ? true : null))}
        testID="proof-sign"
      />
      {bounds.map(({ key, label, usual, unit }) => (
        <View key={key} className="gap-2">
          <Check
            label={label}
            value={step[key] !== null}
            onChange={(asked) => (disabled ? undefined : put(key, asked ? usual : null))}
            testID={`proof-${key}`}
          />
          {step[key] === null ? null : (
            <NumberField
              label="At most"
              value={step[key] ?? usual}
              refuse={positive}
              onChange={(value) => (value === undefined ? undefined : put(key, value))}
              disabled={disabled}
              {...(unit === undefined ? {} : { unit })}
            />
          )}
        </View>
      ))}
      <OtherwiseField
        value={step.otherwise ?? 'hold'}
        choices={['hold', 'continue', 'stop']}
        onChange={(otherwise) => onChange({ ...step, otherwise })}
        disabled={disabled}
      />
    </View>
  );
}
