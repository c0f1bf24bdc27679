import { Redirect, usePathname, type Href } from 'expo-router';
import { Suspense, useEffect, type ReactNode } from 'react';
import { View } from 'react-native';
import { useConnection, useSession } from '@/components/api';
import { Empty, Loading, Offline } from '@/components/ui';
import { fetchScreens, RunningBar } from './lazy-screens';
import { NavigationBar } from './navigation-bar';

/** Around every screen of a signed-in person: bottom tabs on a phone, a side rail from 1024 px, the state of the connection. */
export function Shell({ children }: { children: ReactNode }) {
  const { state, membership } = useSession();
  const { online } = useConnection();
  const pathname = usePathname();
  // While the server is asked who this is.
  useEffect(() => void fetchScreens().catch(() => undefined), []);
  if (state.kind === 'signed-out') return <Redirect href={`/sign-in?then=${encodeURIComponent(pathname)}` as Href} />;
  return (
    <View className="h-full flex-1 flex-col-reverse bg-ink wide:flex-row">
      <NavigationBar />
      <View className="min-h-0 min-w-0 flex-1">
        {online ? null : <Offline />}
        {state.kind === 'unknown' ? (
          <Loading label="Asking the server who you are" />
        ) : membership === null ? (
          <Empty title="No lab yet" icon="lab">
            Your account belongs to no lab. Ask an owner to invite you: the mail holds a link.
          </Empty>
        ) : (
          <Suspense fallback={<Loading />}>
            <RunningBar />
            {children}
          </Suspense>
        )}
      </View>
    </View>
  );
}
