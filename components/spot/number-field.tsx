import { useState } from 'react';
import { Field } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';

interface NumberFieldProps {
  label: string;
  value: number;
  onChange: (value: number) => void;
  unit?: string;
  hint?: string;
  whole?: boolean;
  testID?: string;
}

/** A number that also something else than the keyboard may set. What is typed stays as typed while it means the number, or none. */
export function NumberField({ label, value, onChange, unit, hint, whole = false, testID }: NumberFieldProps) {
  const [typed, setTyped] = useState<string | null>(null);
  const read = typed === null ? null : readDecimal(typed);
  const isNumber = read !== null && (!whole || (Number.isInteger(read) && read >= 0));
  const shown = typed === null || (isNumber && read !== value) ? String(Number(value.toFixed(3))) : typed;
  return (
    <Field
      label={label}
      value={shown}
      type="number"
      unit={unit}
      hint={hint}
      error={typed === null || isNumber ? undefined : whole ? 'a whole number from 0 on' : 'a number'}
      onChange={(text) => {
        setTyped(text);
        const number = readDecimal(text);
        if (number !== null && (!whole || (Number.isInteger(number) && number >= 0))) onChange(number);
      }}
      onBlur={() => setTyped(null)}
      testID={testID}
    />
  );
}
