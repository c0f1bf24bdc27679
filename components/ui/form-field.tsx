import { useController, type Control, type FieldPath, type FieldValues, type UseFormSetError } from 'react-hook-form';
import { fieldErrors, wordsOf } from '@/components/api/problem';
import { Field, type FieldProps } from './field';

type FormFieldProps<T extends FieldValues> = Omit<FieldProps, 'value' | 'onChange' | 'onBlur' | 'error' | 'inputRef'> & {
  control: Control<T>;
  name: FieldPath<T>;
};

/** A `Field` that belongs to a form: its value, its error and the focus at the first wrong field. */
export function FormField<T extends FieldValues>({ control, name, ...field }: FormFieldProps<T>) {
  const { field: input, fieldState } = useController({ control, name });
  return (
    <Field
      {...field}
      value={String(input.value ?? '')}
      onChange={input.onChange}
      onBlur={input.onBlur}
      error={fieldState.error?.message}
      inputRef={input.ref}
    />
  );
}

/** Puts what the server refused at the fields it names; everything else stands above the acts of the form as `root`. */
export function showProblem<T extends FieldValues>(error: unknown, names: readonly FieldPath<T>[], setError: UseFormSetError<T>): void {
  const byField = fieldErrors(error);
  const known = names.filter((name) => byField[name] !== undefined);
  for (const name of known) setError(name, { message: byField[name] ?? '' });
  if (known.length === 0) setError('root', { message: wordsOf(error).detail });
}
