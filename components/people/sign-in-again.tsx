import { useSession } from '@/components/api';
import { Body, Sheet } from '@/components/ui';
import { CredentialsForm } from './credentials-form';

/** Lies over the page when the session has ended, so that nothing typed under it is lost. */
export function SignInAgain() {
  const { state, signedIn } = useSession();
  if (state.kind !== 'expired') return null;
  return (
    <Sheet open title="Sign in again" onClose={() => undefined} mustAnswer testID="sign-in-again">
      <Body tone="dim">Your session has ended. What you were doing is kept under this sheet.</Body>
      <CredentialsForm email={state.me.user.email} onSignedIn={signedIn} />
    </Sheet>
  );
}
