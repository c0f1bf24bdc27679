import { View } from 'react-native';
import { Label, Select } from '@/components/ui';
import { formatDegrees } from '@/shared/lib/format-angle';
import type { SwingStep } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import { NumberField } from './number-field';
import type { StepFormProps } from './step-form';

const angleChoice = ' angle';

function targetOptions(rig: RigDocument | null, present: string) {
  const names = Object.keys(rig?.stations ?? {});
  const known = present === angleChoice || names.includes(present) ? names : [...names, present];
  return [
    ...known.map((name) => ({
      value: name,
      label: rig?.stations[name] === undefined ? `${name} (not on this rig)` : `${name}, ${formatDegrees(rig.stations[name].value)}`,
    })),
    { value: angleChoice, label: 'an angle' },
  ];
}

/** Where the sources go, and how fast. */
export function SwingForm({ step, onChange, rig, disabled }: StepFormProps<SwingStep>) {
  const choice = typeof step.to === 'string' ? step.to : angleChoice;
  const motion = rig?.motion;
  const choose = (next: string) =>
    onChange({
      ...step,
      to:
        next === angleChoice ? { angle_deg: typeof step.to === 'string' ? (rig?.stations[step.to]?.value ?? 0) : step.to.angle_deg } : next,
    });
  return (
    <View className="gap-4">
      <Select label="To" value={choice} options={targetOptions(rig, choice)} onChange={choose} disabled={disabled} testID="swing-to" />
      {typeof step.to === 'string' ? null : (
        <NumberField
          label="Angle"
          unit="°"
          value={step.to.angle_deg}
          onChange={(angle) => (angle === undefined ? undefined : onChange({ ...step, to: { angle_deg: angle } }))}
          disabled={disabled}
          testID="swing-angle"
        />
      )}
      <View className="gap-4 min-[420px]:flex-row min-[420px]:*:flex-1">
        <NumberField
          label="Speed"
          unit="°/s"
          optional
          value={step.speed_deg_s}
          placeholder={motion === undefined ? undefined : String(motion.maxSpeed_deg_s)}
          refuse={below(motion?.maxSpeed_deg_s, '°/s')}
          onChange={(value) => onChange(without({ ...step, speed_deg_s: value }))}
          disabled={disabled}
        />
        <NumberField
          label="Acceleration"
          unit="°/s²"
          optional
          value={step.acceleration_deg_s2}
          placeholder={motion === undefined ? undefined : String(motion.maxAcceleration_deg_s2)}
          refuse={below(motion?.maxAcceleration_deg_s2, '°/s²')}
          onChange={(value) => onChange(without({ ...step, acceleration_deg_s2: value }))}
          disabled={disabled}
        />
      </View>
      <Label>Left empty, the rig’s own greatest speed and acceleration hold.</Label>
      {step.profile === 'shaped' ? (
        <Select
          label="Profile"
          value="shaped"
          options={[
            { value: 'shaped', label: 'shaped (not in this version)' },
            { value: 'plain', label: 'plain' },
          ]}
          onChange={(profile) => onChange({ ...step, profile: profile as 'plain' | 'shaped' })}
          disabled={disabled}
        />
      ) : null}
    </View>
  );
}

const below =
  (limit: number | undefined, unit: string) =>
  (value: number): string | undefined =>
    value <= 0 ? 'a number above 0' : limit !== undefined && value > limit ? `at most ${limit} ${unit} on this rig` : undefined;

/** A field without a value is absent from the document. */
const without = (step: SwingStep): SwingStep =>
  Object.fromEntries(Object.entries(step).filter(([, value]) => value !== undefined)) as SwingStep;
