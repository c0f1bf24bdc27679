import { Select } from '@/components/ui';
import { formatDegrees } from '@/shared/lib/format-angle';
import type { SwingStep } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import { NumberField } from './number-field';

type Target = SwingStep['to'];

interface TargetFieldProps {
  label: string;
  to: Target | undefined;
  onChange: (to: Target) => void;
  rig: RigDocument | null;
  /** What it is called and how it is done to leave the target to the step; absent where one is needed. */
  unset?: { label: string; choose: () => void };
  disabled: boolean | undefined;
  testID: string;
}

const unsetChoice = 'unset';
const angleChoice = 'angle';
/** A station may be called like one of the other choices. */
const stationChoice = (name: string) => `station ${name}`;

const choiceOf = (to: Target | undefined) => (to === undefined ? unsetChoice : typeof to === 'string' ? stationChoice(to) : angleChoice);

/** A station of the rig, also one that it does not have, or an angle. */
export function TargetField({ label, to, onChange, rig, unset, disabled, testID }: TargetFieldProps) {
  const stations = rig?.stations ?? {};
  const names = Object.keys(stations);
  const named = typeof to === 'string' && !names.includes(to) ? [...names, to] : names;
  const angleDeg = typeof to === 'object' ? to.angle_deg : to === undefined ? 0 : (stations[to]?.value ?? 0);
  const options = [
    ...(unset === undefined ? [] : [{ value: unsetChoice, label: unset.label }]),
    ...named.map((name) => {
      const station = stations[name];
      return {
        value: stationChoice(name),
        label: station === undefined ? `${name} (not on this rig)` : `${name}, ${formatDegrees(station.value)}`,
      };
    }),
    { value: angleChoice, label: 'an angle' },
  ];
  const choose = (choice: string) => {
    const name = named.find((each) => stationChoice(each) === choice);
    if (name !== undefined) onChange(name);
    else if (choice === angleChoice) onChange({ angle_deg: angleDeg });
    else unset?.choose();
  };
  return (
    <>
      <Select label={label} value={choiceOf(to)} options={options} onChange={choose} disabled={disabled} testID={`${testID}-to`} />
      {typeof to === 'object' ? (
        <NumberField
          label="Angle"
          unit="°"
          value={angleDeg}
          onChange={(angle) => (angle === undefined ? undefined : onChange({ angle_deg: angle }))}
          disabled={disabled}
          testID={`${testID}-angle`}
        />
      ) : null}
    </>
  );
}
