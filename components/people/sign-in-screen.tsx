import { useQuery } from '@tanstack/react-query';
import { Link, Redirect, useLocalSearchParams, type Href } from 'expo-router';
import { View } from 'react-native';
import { call, useConnection, useSession } from '@/components/api';
import { fetchScreens } from '@/components/shell/lazy-screens';
import { Body, Offline } from '@/components/ui';
import { getHealth } from '@/shared/contracts/service';
import { CredentialsForm } from './credentials-form';
import { PublicPage } from './public-page';

/** Only addresses of this application, so that a link cannot send a person elsewhere after signing in. */
const ownAddress = (wanted: string | undefined): Href => (wanted !== undefined && /^\/(?![/\\])/.test(wanted) ? (wanted as Href) : '/rigs');

/** What lies behind the sign-in comes while the person types; if it does not, it is asked for again when it is shown. */
const fetchAhead = () => void fetchScreens().catch(() => undefined);

/** Where everybody comes in. */
export function SignInScreen() {
  const { state, signedIn } = useSession();
  const { online } = useConnection();
  const { then } = useLocalSearchParams<{ then?: string }>();
  const health = useQuery({ queryKey: ['health'], queryFn: () => call(getHealth), staleTime: Infinity });
  if (state.kind === 'signed-in') return <Redirect href={ownAddress(then)} />;
  return (
    <>
      {online ? null : <Offline />}
      <PublicPage title="Sign in" intro="Plan, run and prove a measurement of gravity with a torsion balance.">
        <View className="gap-4" onFocus={fetchAhead}>
          <CredentialsForm onSignedIn={signedIn} />
          <TextLink href="/forgotten-password" label="Forgotten password" />
          {health.data?.data.demo === true ? (
            <Body size={13} tone="dim">
              This is the demo lab. Its sign-ins were printed where the server was started.
            </Body>
          ) : null}
        </View>
      </PublicPage>
    </>
  );
}

/** A link of 48 px height. */
export function TextLink({ href, label }: { href: Href; label: string }) {
  return (
    <Link href={href} className="self-start py-3.5 font-sans text-15 text-lamp underline">
      {label}
    </Link>
  );
}
