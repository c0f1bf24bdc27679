import { View } from 'react-native';
import { Label, Select } from '@/components/ui';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatDuration } from '@/shared/lib/format-duration';
import type { KickStep } from '@/shared/protocol/document';
import { partsDurationS, partsIfPossible } from '@/shared/protocol/step-parts';
import type { RigDocument } from '@/shared/rig/document';
import { NumberField, positive } from './number-field';
import type { StepFormProps } from './step-form';

const itself = ' itself';

function targetOptions(rig: RigDocument | null, to: KickStep['to']) {
  const stations = Object.entries(rig?.stations ?? {}).map(([name, { value }]) => ({
    value: name,
    label: `${name}, ${formatDegrees(value)}`,
  }));
  const known = to === undefined || typeof to !== 'string' || rig?.stations[to] !== undefined;
  return [
    { value: itself, label: 'far from near, else near' },
    ...stations,
    ...(known ? [] : [{ value: to, label: `${to} (not on this rig)` }]),
    ...(typeof to === 'object' ? [{ value: ' angle', label: formatDegrees(to.angle_deg) }] : []),
  ];
}

/** How the kick would be made: `2 moves in 3.6 min, then a ring-down of 28 min.` */
function movesWords(step: KickStep, rig: RigDocument | null, fromDeg: number | null): string {
  const parts = rig === null || fromDeg === null ? null : partsIfPossible(step, rig, fromDeg);
  if (parts === null) return '';
  const moves = parts.filter(({ kind }) => kind === 'move');
  const ringDownS = parts.reduce((sum, part) => sum + (part.kind === 'ring-down' ? part.lengthS : 0), 0);
  return ` By plan ${moves.length} moves in ${formatDuration(partsDurationS(parts) - ringDownS)}, then a ring-down of ${formatDuration(ringDownS)}.`;
}

/** How far the pendulum is set swinging, and how long its ring-down is recorded. */
export function KickForm({ step, onChange, rig, fromDeg, disabled }: StepFormProps<KickStep>) {
  const choice = step.to === undefined ? itself : typeof step.to === 'string' ? step.to : ' angle';
  const choose = (next: string) => {
    const { to, ...rest } = step;
    if (next === itself) onChange(rest);
    else if (next !== ' angle') onChange({ ...step, to: next });
    else onChange({ ...rest, ...(to === undefined ? {} : { to }) });
  };
  const withoutPeriods = () => {
    const rest = { ...step };
    delete rest.periods;
    return rest;
  };
  return (
    <View className="gap-4">
      <NumberField
        label="Amplitude"
        unit="µrad"
        value={step.amplitude_urad}
        refuse={positive}
        onChange={(value) => (value === undefined ? undefined : onChange({ ...step, amplitude_urad: value }))}
        disabled={disabled}
        testID="kick-amplitude"
      />
      <NumberField
        label="Ring-down recorded after it"
        unit="T"
        optional
        placeholder="3"
        value={step.periods}
        refuse={positive}
        onChange={(value) => onChange(value === undefined ? withoutPeriods() : { ...step, periods: value })}
        disabled={disabled}
        testID="kick-periods"
      />
      <Select
        label="There and back by"
        value={choice}
        options={targetOptions(rig, step.to)}
        onChange={choose}
        disabled={disabled}
        testID="kick-to"
      />
      <Label>
        Sets the pendulum swinging by turning the sources there and back, half a period apart: the ring-down gives period and decay, and is
        no dwell of the series.{movesWords(step, rig, fromDeg)}
      </Label>
    </View>
  );
}
