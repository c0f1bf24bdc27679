import { View } from 'react-native';
import { Label, Tabs } from '@/components/ui';
import { formatDuration } from '@/shared/lib/format-duration';
import { shapedForecast } from '@/shared/planning/shaped-forecast';
import type { SwingStep } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import { NumberField } from './number-field';
import type { StepFormProps } from './step-form';
import { TargetField } from './target-field';

/** Where the sources go, and how fast. */
export function SwingForm({ step, onChange, rig, fromDeg, disabled }: StepFormProps<SwingStep>) {
  const motion = rig?.motion;
  return (
    <View className="gap-4">
      <TargetField label="To" to={step.to} onChange={(to) => onChange({ ...step, to })} rig={rig} disabled={disabled} testID="swing" />
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
      <Tabs
        label="Profile"
        value={step.profile ?? 'plain'}
        options={[
          { value: 'plain', label: 'Plain' },
          { value: 'shaped', label: 'Shaped' },
        ]}
        onChange={disabled ? () => undefined : (profile) => onChange(withProfile(step, profile))}
        testID="swing-profile"
      />
      <Label testID="swing-forecast">
        {step.profile === 'shaped' ? shapedWords(step, rig, fromDeg) : 'One move; the pendulum rings down in the dwell after it.'}
      </Label>
    </View>
  );
}

/** Plain is what the format takes where nothing is said. */
function withProfile({ profile: _, ...rest }: SwingStep, profile: 'plain' | 'shaped'): SwingStep {
  return profile === 'plain' ? rest : { ...rest, profile };
}

const percent = (share: number) => (share < 5e-4 ? 'less than 0.1 %' : `${(100 * share).toPrecision(2)} %`);

/** What the shaped swing is by plan, what it leaves, and how that hangs on the period. */
function shapedWords(step: SwingStep, rig: RigDocument | null, fromDeg: number | null): string {
  const what = 'Several moves that leave the pendulum nearly at rest.';
  const found = rig === null || fromDeg === null ? null : shapedForecast(step, rig, fromDeg);
  if (found === null) return what;
  const known =
    found.atU === null ? '' : `, ${percent(found.atU.residual)} if it is off by its u of ${(100 * found.atU.relativeU).toPrecision(2)} %`;
  return (
    `${what} By plan ${found.moves === 2 ? 'two' : 'three'} in ${formatDuration(found.durationS)}: ${percent(found.residual)} of the step is left as ringing` +
    `${known}, ${percent(found.atOnePercent)} if the period is off by 1 %.`
  );
}

const below =
  (limit: number | undefined, unit: string) =>
  (value: number): string | undefined =>
    value <= 0 ? 'a number above 0' : limit !== undefined && value > limit ? `at most ${limit} ${unit} on this rig` : undefined;

/** A field without a value is absent from the document. */
const without = (step: SwingStep): SwingStep =>
  Object.fromEntries(Object.entries(step).filter(([, value]) => value !== undefined)) as SwingStep;
