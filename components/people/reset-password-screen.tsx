import { zodResolver } from '@hookform/resolvers/zod';
import { useLocalSearchParams } from 'expo-router';
import { useState } from 'react';
import { useForm } from 'react-hook-form';
import { View } from 'react-native';
import * as z from 'zod';
import { call } from '@/components/api';
import { Body, Button, FormField, Panel, showProblem } from '@/components/ui';
import { completePasswordReset, passwordSchema } from '@/shared/contracts/people';
import { PublicPage } from './public-page';
import { TextLink } from './sign-in-screen';

const formSchema = z.strictObject({ password: passwordSchema });

/** Sets a new password with the token of the mail. */
export function ResetPasswordScreen() {
  const { token = '' } = useLocalSearchParams<{ token?: string }>();
  const [done, setDone] = useState(false);
  const { control, handleSubmit, setError, formState } = useForm({ resolver: zodResolver(formSchema), defaultValues: { password: '' } });
  const submit = handleSubmit(async ({ password }) => {
    try {
      await call(completePasswordReset, { body: { token, password } });
      setDone(true);
    } catch (error) {
      showProblem(error, ['password'], setError);
    }
  });
  if (token === '') {
    return (
      <PublicPage title="Link incomplete" intro="The address holds no token. Open the link of the mail in full, or ask for a new one.">
        <TextLink href="/forgotten-password" label="Ask for a new link" />
      </PublicPage>
    );
  }
  return (
    <PublicPage title="New password" intro="All other sessions of your account end when you set it.">
      {done ? (
        <Panel edge="good">
          <Body role="status">The new password is set. Sign in with it.</Body>
        </Panel>
      ) : (
        <View className="gap-5">
          <FormField
            control={control}
            name="password"
            label="New password"
            type="password"
            autoComplete="new-password"
            hint="At least 12 characters. A few words in a row are good."
            onEnter={() => void submit()}
          />
          {formState.errors.root === undefined ? null : (
            <Body role="alert" tone="danger">
              {formState.errors.root.message}
            </Body>
          )}
          <Button kind="primary" size="action" label="Set the password" onPress={() => void submit()} busy={formState.isSubmitting} />
        </View>
      )}
      {formState.errors.root === undefined ? null : <TextLink href="/forgotten-password" label="Ask for a new link" />}
      <TextLink href="/sign-in" label="To sign in" />
    </PublicPage>
  );
}
