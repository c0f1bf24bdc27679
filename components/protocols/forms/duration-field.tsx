import { useState } from 'react';
import { View } from 'react-native';
import { Select } from '@/components/ui';
import { NumberField, positive } from './number-field';

const units = { s: 1, min: 60, h: 3600 } as const;
type Unit = keyof typeof units;

const fitting = (seconds: number): Unit =>
  seconds >= 7200 && seconds % 1800 === 0 ? 'h' : seconds >= 120 && seconds % 30 === 0 ? 'min' : 's';
/** Seconds of a document have no more than six decimals worth keeping. */
const rounded = (value: number) => Number(value.toPrecision(12));

interface DurationFieldProps {
  label: string;
  seconds: number;
  onChange: (seconds: number) => void;
  disabled?: boolean;
  testID?: string;
}

/** A length of time in the unit in which it is a round number. */
export function DurationField({ label, seconds, onChange, disabled, testID }: DurationFieldProps) {
  const [unit, setUnit] = useState<Unit>(() => fitting(seconds));
  return (
    <View className="flex-row items-start gap-3">
      <View className="min-w-0 flex-1">
        <NumberField
          key={unit}
          label={label}
          value={rounded(seconds / units[unit])}
          onChange={(value) => (value === undefined ? undefined : onChange(rounded(value * units[unit])))}
          refuse={positive}
          disabled={disabled}
          testID={testID}
        />
      </View>
      <View className="w-[110px]">
        <Select
          label="Unit"
          value={unit}
          options={[
            { value: 's', label: 's' },
            { value: 'min', label: 'min' },
            { value: 'h', label: 'h' },
          ]}
          onChange={setUnit}
          disabled={disabled}
        />
      </View>
    </View>
  );
}
