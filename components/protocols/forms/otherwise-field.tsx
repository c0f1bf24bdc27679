import { Select } from '@/components/ui';
import type { Otherwise } from '@/shared/protocol/wait';

const words: Record<Otherwise, string> = {
  hold: 'hold, until a person resumes',
  continue: 'go on all the same',
  stop: 'stop the run',
};

interface OtherwiseFieldProps<V extends Otherwise> {
  value: V;
  choices: readonly V[];
  onChange: (value: V) => void;
  disabled: boolean;
}

/** What becomes of the run where a condition is not met in time. */
export function OtherwiseField<V extends Otherwise>({ value, choices, onChange, disabled }: OtherwiseFieldProps<V>) {
  return (
    <Select
      label="Otherwise"
      value={value}
      options={choices.map((choice) => ({ value: choice, label: words[choice] }))}
      onChange={onChange}
      disabled={disabled}
      testID="otherwise"
    />
  );
}
