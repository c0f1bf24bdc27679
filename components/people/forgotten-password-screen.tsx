import { zodResolver } from '@hookform/resolvers/zod';
import { useState } from 'react';
import { useForm } from 'react-hook-form';
import { View } from 'react-native';
import { call } from '@/components/api';
import { Body, Button, FormField, Panel, showProblem } from '@/components/ui';
import { requestPasswordReset } from '@/shared/contracts/people';
import { PublicPage } from './public-page';
import { TextLink } from './sign-in-screen';

/** Asks for a reset link. The answer is the same whether the address is known or not. */
export function ForgottenPasswordScreen() {
  const [sentTo, setSentTo] = useState<string | null>(null);
  const { control, handleSubmit, setError, formState } = useForm({
    resolver: zodResolver(requestPasswordReset.body),
    defaultValues: { email: '' },
  });
  const submit = handleSubmit(async (body) => {
    try {
      await call(requestPasswordReset, { body });
      setSentTo(body.email);
    } catch (error) {
      showProblem(error, ['email'], setError);
    }
  });
  return (
    <PublicPage title="Forgotten password" intro="We send a link with which you set a new one. It works once, for a short time.">
      {sentTo === null ? (
        <View className="gap-5">
          <FormField control={control} name="email" label="E-mail" type="email" autoComplete="username" onEnter={() => void submit()} />
          {formState.errors.root === undefined ? null : (
            <Body role="alert" tone="danger">
              {formState.errors.root.message}
            </Body>
          )}
          <Button kind="primary" size="action" label="Send the link" onPress={() => void submit()} busy={formState.isSubmitting} />
        </View>
      ) : (
        <Panel edge="good">
          <Body role="status">If {sentTo} has an account here, a mail with the link is on its way. Look into the spam folder too.</Body>
        </Panel>
      )}
      <TextLink href="/sign-in" label="Back to sign in" />
    </PublicPage>
  );
}
