import { Link, router, useLocalSearchParams, type Href } from 'expo-router';
import { View } from 'react-native';
import { isProblem, useLab, useLabQuery, wordsOf } from '@/components/api';
import { DifferencesList } from '@/components/protocols/differences-list';
import { Body, Empty, Label, Loading, Panel, ProblemNotice, Screen, Section, Select } from '@/components/ui';
import { readMorning, type MorningSheet } from '@/shared/contracts/morning';
import { getRun, listRuns, listSteps, type RunSummary, type RunView } from '@/shared/contracts/runs';
import { formatClock, formatDay } from '@/shared/lib/format-time';
import { MeasuredPanel } from './compare-measured';
import { ComparedSteps } from './compare-steps';
import { isOver } from './run-words';

const none = '';

/** Two runs of one rig side by side: protocol, what was measured, and where their step logs differ. */
export function CompareRunsScreen() {
  const { runId, with: chosen = none } = useLocalSearchParams<{ runId: string; with?: string }>();
  const { timeZone } = useLab();
  const query = useLabQuery(getRun, { params: { runId } });
  const run = query.data?.data;
  const back = { href: `/runs/${runId}/log` as Href, label: 'the step log' };
  if (run === undefined)
    return (
      <Screen title="Compare two runs" back={back} testID="compare-screen">
        {query.isError ? (
          <ProblemNotice title="The run could not be read" {...wordsOf(query.error)} />
        ) : (
          <Loading label="Loading the run" />
        )}
      </Screen>
    );
  return (
    <Screen title="Compare two runs" back={back} testID="compare-screen">
      <Chooser run={run} chosen={chosen} timeZone={timeZone} />
      {chosen === none ? null : <Comparison key={chosen} one={run} otherId={chosen} />}
    </Screen>
  );
}

export const runTitle = ({ startedAt, createdAt, protocolName, protocolRevision, rehearsal }: RunSummary, timeZone: string): string => {
  const at = Date.parse(startedAt ?? createdAt);
  const revision = protocolRevision === 0 ? '' : `, revision ${protocolRevision}`;
  return `${formatDay(at, timeZone)} ${formatClock(at, { timeZone })}, ${rehearsal ? 'rehearsal of ' : ''}${protocolName}${revision}`;
};

/** The second run: any other of the rig that is over, rehearsals too. */
function Chooser({ run, chosen, timeZone }: { run: RunView; chosen: string; timeZone: string }) {
  const query = useLabQuery(listRuns, { query: { rigId: run.rigId, limit: 100 } });
  const others = query.data?.data.items.filter(({ id, state }) => id !== run.id && isOver(state)) ?? [];
  if (query.isPending) return <Loading label="Loading the runs of the rig" />;
  if (query.isError) return <ProblemNotice title="The runs of the rig could not be read" {...wordsOf(query.error)} />;
  if (others.length === 0)
    return (
      <Empty title="No other run to compare with" icon="compare">
        {`${run.rigName} has no other run or rehearsal that is over.`}
      </Empty>
    );
  const options = [
    { value: none, label: 'Choose a run' },
    ...others.map((other) => ({ value: other.id, label: runTitle(other, timeZone) })),
    ...(chosen === none || others.some(({ id }) => id === chosen) ? [] : [{ value: chosen, label: 'The run of the address' }]),
  ];
  return (
    <Panel className="gap-3">
      <View>
        <Label>First</Label>
        <Body>{runTitle(run, timeZone)}</Body>
      </View>
      <Select label="Second" value={chosen} options={options} onChange={(id) => router.setParams({ with: id })} testID="compare-with" />
    </Panel>
  );
}

function Comparison({ one, otherId }: { one: RunView; otherId: string }) {
  const second = useLabQuery(getRun, { params: { runId: otherId } });
  const [firstSheet, secondSheet] = [useSheet(one.id), useSheet(otherId)];
  const firstSteps = useLabQuery(listSteps, { params: { runId: one.id } });
  const secondSteps = useLabQuery(listSteps, { params: { runId: otherId } });
  const failed = [second, firstSteps, secondSteps].find(({ isError }) => isError);
  if (failed !== undefined) return <Problem title="The runs could not be compared" {...wordsOf(failed.error)} />;
  const other = second.data?.data;
  const rows = [firstSteps.data?.data.items, secondSteps.data?.data.items] as const;
  if (other === undefined || rows[0] === undefined || rows[1] === undefined) return <Loading label="Loading both runs" />;
  if (other.rigId !== one.rigId)
    return (
      <Problem
        title="The runs are of different rigs"
        detail={`${one.rigName} and ${other.rigName} are not compared: choose a run of ${one.rigName}.`}
      />
    );
  return (
    <>
      <MeasuredPanel one={{ run: one, sheet: firstSheet }} other={{ run: other, sheet: secondSheet }} />
      <Section title="Protocol" remark="From the first to the second.">
        <Panel>
          <DifferencesList before={one.protocol} after={other.protocol} />
        </Panel>
      </Section>
      <ComparedSteps one={rows[0]} other={rows[1]} protocol={one.protocol} />
      <Links ids={[one.id, other.id]} />
    </>
  );
}

function Problem(words: { title: string; detail: string }) {
  return (
    <View testID="compare-problem">
      <ProblemNotice {...words} />
    </View>
  );
}

/** The morning sheet of a run; null while it is not there, and for a run that has none. */
function useSheet(runId: string): { sheet: MorningSheet | null; why: string } {
  const query = useLabQuery(readMorning, { params: { runId } });
  if (query.isSuccess) return { sheet: query.data.data, why: '' };
  if (query.isPending) return { sheet: null, why: 'is being read' };
  return { sheet: null, why: isProblem(query.error, 'not-possible-now') ? 'comes when the run is over' : wordsOf(query.error).detail };
}

function Links({ ids }: { ids: readonly [string, string] }) {
  return (
    <View className="flex-row flex-wrap gap-x-6 gap-y-2">
      {ids.map((id, index) => (
        <Link key={id} href={`/runs/${id}/log` as Href} className="min-h-11 py-2 underline">
          <Body>{index === 0 ? 'Step log of the first' : 'Step log of the second'}</Body>
        </Link>
      ))}
    </View>
  );
}
