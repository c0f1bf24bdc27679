import { useState } from 'react';
import { Field } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';

interface NumberFieldProps {
  label: string;
  /** Absent: the field is empty and the rig's or the format's default holds. */
  value: number | undefined;
  onChange: (value: number | undefined) => void;
  unit?: string;
  hint?: string;
  /** May be left empty. */
  optional?: boolean;
  placeholder?: string;
  /** Why a number is not accepted, or undefined. */
  refuse?: (value: number) => string | undefined;
  disabled?: boolean;
  testID?: string;
}

/** A number that goes into the document as soon as it is one; anything else stays in the field with the reason under it. */
export function NumberField({
  label,
  value,
  onChange,
  unit,
  hint,
  optional = false,
  placeholder,
  refuse,
  disabled,
  testID,
}: NumberFieldProps) {
  const [typed, setTyped] = useState<string | null>(null);
  const text = typed === null || isOld(typed, { value, optional, refuse }) ? (value === undefined ? '' : String(value)) : typed;
  const read = readDecimal(text);
  const wrong =
    text.trim() === '' ? (optional ? undefined : 'a number is needed') : read === null ? 'a number, for example 2.5' : refuse?.(read);
  const change = (next: string) => {
    setTyped(next);
    const number = readDecimal(next);
    if (next.trim() === '' && optional) onChange(undefined);
    else if (number !== null && refuse?.(number) === undefined) onChange(number);
  };
  return (
    <Field
      label={label}
      value={text}
      onChange={change}
      onBlur={() => (wrong === undefined ? setTyped(null) : undefined)}
      type="number"
      unit={unit}
      hint={hint}
      error={wrong}
      placeholder={placeholder}
      disabled={disabled}
      testID={testID}
    />
  );
}

/** What was typed went into the document, and the document has another value since: by undo, for example. */
function isOld(typed: string, { value, optional, refuse }: Pick<NumberFieldProps, 'value' | 'optional' | 'refuse'>): boolean {
  if (typed.trim() === '') return optional === true && value !== undefined;
  const number = readDecimal(typed);
  return number !== null && refuse?.(number) === undefined && number !== value;
}

export const positive = (value: number): string | undefined => (value > 0 ? undefined : 'a number above 0');
export const wholeFromOne = (value: number): string | undefined =>
  Number.isInteger(value) && value >= 1 ? undefined : 'a whole number from 1';
