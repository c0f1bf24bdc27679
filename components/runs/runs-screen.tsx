import { useInfiniteQuery } from '@tanstack/react-query';
import { View } from 'react-native';
import { call, labKey, useLab, wordsOf } from '@/components/api';
import { Button, Empty, Loading, ProblemNotice, Screen, Section } from '@/components/ui';
import { listRuns } from '@/shared/contracts/runs';
import { isOver } from './run-words';
import { RunRow } from './run-row';

const everyMs = 10_000;

/** All runs and rehearsals, newest first; those going on stand on top. */
export function RunsScreen() {
  const { labId, timeZone } = useLab();
  const query = useInfiniteQuery({
    queryKey: labKey(labId, listRuns, { query: 'pages' }),
    queryFn: ({ pageParam, signal }) =>
      call(listRuns, { params: { labId }, query: { limit: 20, ...(pageParam === null ? {} : { cursor: pageParam }) }, signal }),
    initialPageParam: null as string | null,
    getNextPageParam: (page) => page.data.next,
    refetchInterval: everyMs,
  });
  const runs = query.data?.pages.flatMap((page) => page.data.items) ?? [];
  const going = runs.filter((run) => !isOver(run.state));
  const over = runs.filter((run) => isOver(run.state));
  return (
    <Screen title="Runs" testID="runs-screen">
      {query.isPending ? <Loading label="Loading the runs" /> : null}
      {query.isError && runs.length === 0 ? (
        <ProblemNotice
          title="The runs could not be loaded"
          detail={wordsOf(query.error).detail}
          action={{ label: 'Try again', onPress: () => void query.refetch() }}
        />
      ) : null}
      {query.isSuccess && runs.length === 0 ? (
        <Empty title="No runs yet" icon="runs">
          Start one from an issued protocol, or rehearse a protocol: a rehearsal runs a whole night on the simulated rig in seconds.
        </Empty>
      ) : null}
      {going.length === 0 ? null : (
        <Section title="Going on">
          <View>
            {going.map((run, index) => (
              <RunRow key={run.id} run={run} timeZone={timeZone} last={index === going.length - 1} />
            ))}
          </View>
        </Section>
      )}
      {over.length === 0 ? null : (
        <Section title="Ended">
          <View>
            {over.map((run, index) => (
              <RunRow key={run.id} run={run} timeZone={timeZone} last={index === over.length - 1} />
            ))}
          </View>
        </Section>
      )}
      {query.hasNextPage ? (
        <Button label="Show older runs" busy={query.isFetchingNextPage} onPress={() => void query.fetchNextPage()} />
      ) : null}
    </Screen>
  );
}
