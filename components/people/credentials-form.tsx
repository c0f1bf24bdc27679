import { zodResolver } from '@hookform/resolvers/zod';
import { useEffectEvent, useLayoutEffect, useState } from 'react';
import { useForm } from 'react-hook-form';
import { View } from 'react-native';
import { call } from '@/components/api';
import { Body, Button, FormField, showProblem } from '@/components/ui';
import { signIn, type Me } from '@/shared/contracts/people';
import { findEarlyForm, type EarlyForm } from './early-form';

interface CredentialsFormProps {
  /** Given when the person is known and only the session ended. */
  email?: string;
  onSignedIn: (me: Me) => void;
}

/** E-mail and password; what was typed stays when the server refuses. */
export function CredentialsForm({ email, onSignedIn }: CredentialsFormProps) {
  const { control, handleSubmit, setError, setFocus, setValue, formState } = useForm({
    resolver: zodResolver(signIn.body),
    defaultValues: { email: email ?? '', password: '' },
  });
  const submit = handleSubmit(async (body) => {
    try {
      onSignedIn((await call(signIn, { body })).data);
    } catch (error) {
      showProblem(error, ['email', 'password'], setError);
    }
  });
  const send = () => void submit();
  const takeOver = useEffectEvent((early: EarlyForm) => {
    const typed = early.take();
    if (typed === null) return;
    if (typed.email !== '') setValue('email', typed.email);
    if (typed.password !== '') setValue('password', typed.password);
    if (early.focused !== null) setFocus(early.focused);
    if (typed.pressed) send();
  });
  const [early] = useState(findEarlyForm);
  useLayoutEffect(() => {
    if (early !== null) takeOver(early);
  }, [early]);
  return (
    <form
      className="contents"
      noValidate
      onSubmit={(event) => {
        event.preventDefault();
        send();
      }}
    >
      <View className="gap-5">
        <FormField control={control} name="email" label="E-mail" type="email" autoComplete="username" testID="sign-in-email" />
        <FormField
          control={control}
          name="password"
          label="Password"
          type="password"
          autoComplete="current-password"
          onEnter={send}
          testID="sign-in-password"
        />
        {formState.errors.root === undefined ? null : (
          <Body role="alert" tone="danger">
            {formState.errors.root.message}
          </Body>
        )}
        <Button kind="primary" label="Sign in" size="action" onPress={send} busy={formState.isSubmitting} testID="sign-in" />
      </View>
    </form>
  );
}
