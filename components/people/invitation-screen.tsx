import { zodResolver } from '@hookform/resolvers/zod';
import { useQuery } from '@tanstack/react-query';
import { useLocalSearchParams, useRouter } from 'expo-router';
import { useForm } from 'react-hook-form';
import { View } from 'react-native';
import * as z from 'zod';
import { call, useSession, wordsOf } from '@/components/api';
import { Body, Button, FormField, Loading, ProblemNotice, showProblem } from '@/components/ui';
import { acceptInvitation, getInvitation, passwordSchema } from '@/shared/contracts/people';
import { PublicPage } from './public-page';
import { TextLink } from './sign-in-screen';

const newcomerSchema = z.strictObject({ name: z.string().min(1, 'your name as the log shall show it').max(120), password: passwordSchema });
const knownSchema = z.strictObject({ name: z.string(), password: z.string().min(1, 'the password of your account here') });

/** What an invitation offers, and how to take it. */
export function InvitationScreen() {
  const { token = '' } = useLocalSearchParams<{ token: string }>();
  const offer = useQuery({ queryKey: ['invitation', token], queryFn: () => call(getInvitation, { params: { token } }), retry: false });
  if (offer.isPending) return <PublicPage title="Invitation">{<Loading label="Reading the invitation" />}</PublicPage>;
  if (offer.isError) {
    return (
      <PublicPage title="Invitation">
        <ProblemNotice title="This invitation cannot be used" detail={wordsOf(offer.error).detail} />
        <TextLink href="/sign-in" label="To sign in" />
      </PublicPage>
    );
  }
  const { labName, email, role, hasAccount } = offer.data.data;
  return (
    <PublicPage title={labName} intro={`${email} is invited to this lab as ${role}.`}>
      <AcceptForm token={token} hasAccount={hasAccount} />
    </PublicPage>
  );
}

function AcceptForm({ token, hasAccount }: { token: string; hasAccount: boolean }) {
  const { signedIn } = useSession();
  const router = useRouter();
  const { control, handleSubmit, setError, formState } = useForm({
    resolver: zodResolver(hasAccount ? knownSchema : newcomerSchema),
    defaultValues: { name: '', password: '' },
  });
  const submit = handleSubmit(async ({ name, password }) => {
    try {
      const { data } = await call(acceptInvitation, { params: { token }, body: hasAccount ? { password } : { name, password } });
      signedIn(data);
      router.replace('/rigs');
    } catch (error) {
      showProblem(error, ['name', 'password'], setError);
    }
  });
  return (
    <View className="gap-5">
      {hasAccount ? (
        <Body tone="dim">You have an account here already: give its password to join.</Body>
      ) : (
        <FormField
          control={control}
          name="name"
          label="Your name"
          autoComplete="name"
          hint="As the step log and the audit shall show it."
        />
      )}
      <FormField
        control={control}
        name="password"
        label="Password"
        type="password"
        autoComplete={hasAccount ? 'current-password' : 'new-password'}
        hint={hasAccount ? undefined : 'At least 12 characters. A few words in a row are good.'}
        onEnter={() => void submit()}
      />
      {formState.errors.root === undefined ? null : (
        <Body role="alert" tone="danger">
          {formState.errors.root.message}
        </Body>
      )}
      <Button kind="primary" size="action" label="Join the lab" onPress={() => void submit()} busy={formState.isSubmitting} />
    </View>
  );
}
