import { Redirect, usePathname, type Href } from 'expo-router';
import { Suspense, useEffect, type ReactNode } from 'react';
import { View } from 'react-native';
import { isProblem, useConnection, useSession, wordsOf } from '@/components/api';
import { Body, Empty, Loading, Offline, ProblemNotice } from '@/components/ui';
import { AlarmBar, fetchScreens, RunningBar } from './lazy-screens';
import { NavigationBar } from './navigation-bar';
import { NewVersion } from './new-version';

/** Around every screen of a signed-in person: bottom tabs on a phone, a side rail from 1024 px, the state of the connection. */
export function Shell({ children }: { children: ReactNode }) {
  const { state, problem, membership } = useSession();
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
          <Asking problem={problem} />
        ) : membership === null ? (
          <Empty title="No lab yet" icon="lab">
            Your account belongs to no lab. Ask an owner to invite you: the mail holds a link.
          </Empty>
        ) : (
          <Suspense fallback={<Loading />}>
            <AlarmBar />
            <RunningBar />
            <NewVersion />
            {children}
          </Suspense>
        )}
      </View>
    </View>
  );
}

/** Until the server says who this is; where its database is away it says so, and that a run needs neither. */
function Asking({ problem }: { problem: unknown }) {
  if (!isProblem(problem, 'database-away')) return <Loading label="Asking the server who you are" />;
  return (
    <View className="max-w-[560px] gap-4 p-4 wide:p-7" testID="asking-failed">
      <ProblemNotice
        title="The server does not know you at the moment"
        detail={`${wordsOf(problem).detail} This page asks again every 3 s.`}
      />
      <Body tone="dim">
        A run goes on, holds or stops by its protocol without this page. If it must stop now, use the switch at the rig.
      </Body>
    </View>
  );
}
