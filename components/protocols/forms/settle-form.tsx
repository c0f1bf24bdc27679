import { View } from 'react-native';
import { Label, Tabs } from '@/components/ui';
import type { SettleStep } from '@/shared/protocol/document';
import { isCalm, waitOf, type CalmStep } from '@/shared/protocol/wait';
import { DurationField } from './duration-field';
import { NumberField, positive } from './number-field';
import { OtherwiseField } from './otherwise-field';
import type { StepFormProps } from './step-form';

/** How long to wait for creep and heat, or until what. */
export function SettleForm({ step, onChange, rig, disabled }: StepFormProps<SettleStep>) {
  const label = step.label === undefined ? {} : { label: step.label };
  const windowS = Math.round(1.5 * (rig?.measured?.period_s?.value ?? 400));
  const choose = (kind: 'time' | 'calm') =>
    onChange(
      kind === 'time'
        ? { kind: 'settle', for_s: 600, ...label }
        : { kind: 'settle', calmWhen: { drift_urad_per_h: 100, window_s: windowS }, atMost_s: 5400, otherwise: 'continue', ...label },
    );
  return (
    <View className="gap-4">
      <Tabs
        label="Until when"
        value={isCalm(step) ? 'calm' : 'time'}
        options={[
          { value: 'time', label: 'A fixed time' },
          { value: 'calm', label: 'Until calm' },
        ]}
        onChange={disabled ? () => undefined : choose}
        testID="settle-kind"
      />
      {isCalm(step) ? (
        <CalmFields step={step} onChange={onChange} disabled={disabled} />
      ) : (
        <DurationField
          label="Time"
          seconds={step.for_s ?? 0}
          onChange={(seconds) => onChange({ kind: 'settle', for_s: seconds, ...label })}
          disabled={disabled}
          testID="settle-time"
        />
      )}
      <Label>For creep and heat after loading or touching, not against ringing: whole periods from swing to swing do that better.</Label>
    </View>
  );
}

function CalmFields({ step, onChange, disabled }: { step: CalmStep; onChange: (step: SettleStep) => void; disabled: boolean }) {
  const { calmWhen } = step;
  const wait = waitOf(step);
  const { amplitude_urad: amplitude, drift_urad_per_h: drift, window_s: windowS } = calmWhen;
  const limits = (next: { amplitude?: number | undefined; drift?: number | undefined }) => {
    if (next.amplitude === undefined && next.drift === undefined) return;
    onChange({
      ...step,
      calmWhen: {
        ...(next.amplitude === undefined ? {} : { amplitude_urad: next.amplitude }),
        ...(next.drift === undefined ? {} : { drift_urad_per_h: next.drift }),
        window_s: windowS,
      },
    });
  };
  return (
    <View className="gap-4">
      <NumberField
        label="Drift below"
        unit="µrad/h"
        value={drift}
        optional={amplitude !== undefined}
        refuse={positive}
        onChange={(value) => limits({ amplitude, drift: value })}
        disabled={disabled}
        testID="calm-drift"
      />
      <NumberField
        label="Amplitude of the free swing below"
        unit="µrad"
        value={amplitude}
        optional={drift !== undefined}
        placeholder="not asked for"
        refuse={positive}
        onChange={(value) => limits({ amplitude: value, drift })}
        disabled={disabled}
        testID="calm-amplitude"
      />
      <DurationField
        label="Over the last"
        seconds={windowS}
        onChange={(seconds) => onChange({ ...step, calmWhen: { ...calmWhen, window_s: seconds } })}
        disabled={disabled}
      />
      <DurationField
        label="Give up after"
        seconds={wait?.atMostS ?? 0}
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
