import { useId, type ReactNode, type Ref } from 'react';
import { View } from 'react-native';
import { Icon } from './icon';
import { Body, Label } from './text';

interface AroundProps {
  id: string;
  label: string;
  hint?: ReactNode;
  error?: string | undefined;
  children: ReactNode;
}

/** Label above, hint and error below; the input points at both. */
function FieldFrame({ id, label, hint, error, children }: AroundProps) {
  return (
    <View className="gap-1.5">
      <label htmlFor={id} className="font-sans text-15 font-medium text-text">
        {label}
      </label>
      {children}
      {hint === undefined ? null : (
        <Label nativeID={`${id}-hint`} className="leading-[18px]">
          {hint}
        </Label>
      )}
      {error === undefined ? null : (
        <Body nativeID={`${id}-error`} role="alert" size={13} tone="danger">
          {error}
        </Body>
      )}
    </View>
  );
}

const describedBy = (id: string, hint: unknown, error: unknown) =>
  [hint === undefined ? '' : `${id}-hint`, error === undefined ? '' : `${id}-error`].filter(Boolean).join(' ') || undefined;

export interface FieldProps {
  label: string;
  value: string;
  onChange: (value: string) => void;
  hint?: ReactNode;
  error?: string | undefined;
  type?: 'text' | 'email' | 'password' | 'number' | 'date' | 'time' | 'datetime-local';
  /** Numbers and codes: monospaced, decimal keyboard on a phone. */
  mono?: boolean;
  lines?: number;
  unit?: string;
  autoComplete?: string;
  placeholder?: string;
  disabled?: boolean;
  onEnter?: () => void;
  onBlur?: () => void;
  inputRef?: Ref<HTMLInputElement>;
  testID?: string;
}

/** A labelled input of 48 px; several lines when `lines` is given. Numbers are typed as text so that both decimal signs work. */
export function Field({
  label,
  value,
  onChange,
  hint,
  error,
  type = 'text',
  mono = false,
  lines,
  unit,
  autoComplete,
  placeholder,
  disabled,
  onEnter,
  onBlur,
  inputRef,
  testID,
}: FieldProps) {
  const id = useId();
  const shared = {
    id,
    value,
    disabled,
    placeholder,
    onBlur,
    'data-testid': testID,
    'aria-invalid': error === undefined ? undefined : true,
    'aria-describedby': describedBy(id, hint, error),
    className: `ef-field ${mono || type === 'number' ? 'ef-mono' : ''}`,
  };
  const decimal = type === 'number';
  return (
    <FieldFrame id={id} label={label} hint={hint} error={error}>
      {lines === undefined ? (
        <View className="flex-row items-center gap-2">
          <input
            {...shared}
            ref={inputRef}
            type={decimal ? 'text' : type}
            inputMode={decimal ? 'decimal' : undefined}
            autoComplete={autoComplete}
            autoCapitalize={type === 'email' || mono ? 'none' : undefined}
            spellCheck={mono || type === 'email' ? false : undefined}
            onChange={(event) => onChange(event.target.value)}
            onKeyDown={(event) => (event.key === 'Enter' && onEnter !== undefined ? onEnter() : undefined)}
          />
          {unit === undefined ? null : <Body tone="dim">{unit}</Body>}
        </View>
      ) : (
        <textarea {...shared} rows={lines} spellCheck={!mono} onChange={(event) => onChange(event.target.value)} />
      )}
    </FieldFrame>
  );
}

export interface SelectProps<V extends string> {
  label: string;
  value: V;
  options: readonly { value: V; label: string }[];
  onChange: (value: V) => void;
  hint?: ReactNode;
  error?: string | undefined;
  disabled?: boolean;
  testID?: string;
}

/** The browser's own choice list: known to every thumb and every screen reader. */
export function Select<V extends string>({ label, value, options, onChange, hint, error, disabled, testID }: SelectProps<V>) {
  const id = useId();
  const choose = (chosen: string) => {
    const option = options.find((each) => each.value === chosen);
    if (option !== undefined) onChange(option.value);
  };
  return (
    <FieldFrame id={id} label={label} hint={hint} error={error}>
      <View className="relative">
        <select
          id={id}
          data-testid={testID}
          className="ef-field pr-10"
          value={value}
          disabled={disabled}
          aria-describedby={describedBy(id, hint, error)}
          aria-invalid={error === undefined ? undefined : true}
          onChange={(event) => choose(event.target.value)}
        >
          {options.map((option) => (
            <option key={option.value} value={option.value}>
              {option.label}
            </option>
          ))}
        </select>
        <View className="pointer-events-none absolute bottom-0 right-3 top-0 justify-center">
          <Icon name="open" size={18} tone="dim" />
        </View>
      </View>
    </FieldFrame>
  );
}
