import { useLocalSearchParams, type Href } from 'expo-router';
import { useEffect, useMemo, useState } from 'react';
import { View } from 'react-native';
import { addressOf, useLab, useLabQuery, wordsOf } from '@/components/api';
import { useFrames } from '@/components/cameras/use-cameras';
import { excludedPart } from '@/components/data/stretch';
import { useExclusions } from '@/components/data/exclusion-list';
import { Empty, FilterGroup, Label, Loading, Panel, ProblemNotice, Screen, Select, Tabs, useWide } from '@/components/ui';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { getRun, listSteps, stepsCsv, stepsJson, type StepRowView } from '@/shared/contracts/runs';
import { zoneName } from '@/shared/lib/format-time';
import { DownloadLink } from './download-link';
import { ChainHead } from './event-list';
import { TextLink } from './recent-steps';
import { isOver } from './run-words';
import { StepDetails, stretchOf } from './step-details';
import { everything, filterChoices, filterSteps, noFilter, type StepFilter } from './step-filter';
import { useStepNotes } from './step-notes';
import { StepCards, StepTable, type StepListProps } from './step-table';
import { useEvents } from './use-events';

const everyMs = 4000;

/** The step log of a run: what was planned, what happened, and how well the times are known. */
export function StepLogScreen() {
  const { runId, row } = useLocalSearchParams<{ runId: string; row?: string }>();
  const { timeZone } = useLab();
  const run = useLabQuery(getRun, { params: { runId }, everyMs: everyMs * 2 });
  const over = run.data !== undefined && isOver(run.data.data.state);
  const steps = useLabQuery(listSteps, { params: { runId }, ...(over ? {} : { everyMs }) });
  const events = useEvents(runId, !over);
  const rows = steps.data?.data.items ?? [];
  return (
    <Screen
      title="Step log"
      back={{ href: `/runs/${runId}` as Href, label: run.data?.data.rigName ?? 'the run' }}
      trailing={<Downloads runId={runId} />}
      testID="step-log"
    >
      {steps.isPending ? <Loading label="Loading the step log" /> : null}
      {steps.isError ? (
        <ProblemNotice
          title="The step log could not be loaded"
          detail={wordsOf(steps.error).detail}
          action={{ label: 'Try again', onPress: () => void steps.refetch() }}
        />
      ) : null}
      {steps.isSuccess && rows.length === 0 ? (
        <Empty title="No steps yet">The first row appears when the run begins its first step.</Empty>
      ) : null}
      {rows.length === 0 ? null : (
        <LoggedSteps
          runId={runId}
          rows={rows}
          events={events.data ?? []}
          protocol={run.data?.data.protocol ?? null}
          timeZone={timeZone}
          over={over}
          first={row === undefined ? null : Number(row)}
        />
      )}
    </Screen>
  );
}

/** The step log as a file: for a spreadsheet, and for a program. */
function Downloads({ runId }: { runId: string }) {
  const { labId } = useLab();
  const asked = { params: { labId, runId } };
  return (
    <View className="flex-row">
      <DownloadLink address={addressOf(stepsCsv, asked)} label="CSV" fileName={`steps-${runId}.csv`} testID="steps-csv" />
      <DownloadLink address={addressOf(stepsJson, asked)} label="JSON" fileName={`steps-${runId}.json`} testID="steps-json" />
    </View>
  );
}

interface LoggedStepsProps extends Pick<StepListProps, 'rows' | 'protocol'> {
  runId: string;
  events: readonly ChainedEvent[];
  timeZone: string;
  over: boolean;
  /** The row that a link leads to: open, and scrolled to. */
  first: number | null;
}

function LoggedSteps({ runId, rows, events, protocol, timeZone, over, first }: LoggedStepsProps) {
  const wide = useWide();
  const [filter, setFilter] = useState<StepFilter>(noFilter);
  const [zone, setZone] = useState<'lab' | 'utc'>('lab');
  const [open, setOpen] = useState<number | null>(first);
  useEffect(() => {
    if (first !== null) document.querySelector(`[data-testid="events-${first}"]`)?.scrollIntoView({ block: 'center' });
  }, [first]);
  const shown = useMemo(() => filterSteps(rows, filter), [rows, filter]);
  const exclusions = useExclusions(runId);
  const notes = useStepNotes(runId);
  const frames = useFrames(runId, over ? undefined : everyMs);
  const list: StepListProps = {
    rows: shown,
    protocol,
    base: { timeZone: zone === 'utc' ? null : timeZone },
    excluded: (row) => {
      const stretch = stretchOf(row);
      return stretch === null ? null : excludedPart(exclusions.exclusions, stretch);
    },
    noted: (row) => notes.notes.filter(({ seq }) => seq === row.seq).length,
    details: (row) => (
      <StepDetails {...{ runId, row, events, timeZone, exclusions, notes }} frames={frames.filter(({ seq }) => seq === row.seq)} />
    ),
    open,
    onOpen: setOpen,
  };
  return (
    <View className="gap-4">
      <Filters rows={rows} filter={filter} onChange={setFilter} />
      <View className="flex-row flex-wrap items-center justify-between gap-3">
        <Label>
          {shown.length === rows.length ? `${rows.length} rows` : `${shown.length} of ${rows.length} rows`}, times in{' '}
          {zone === 'utc' ? 'UTC' : zoneName(timeZone)}
        </Label>
        <View className="w-[220px]">
          <Tabs
            label="Times in"
            value={zone}
            onChange={setZone}
            options={[
              { value: 'lab', label: 'Lab time' },
              { value: 'utc', label: 'UTC' },
            ]}
          />
        </View>
      </View>
      {shown.length === 0 ? (
        <Empty title="No row like that" icon="filter" action={{ label: 'Show all rows', onPress: () => setFilter(noFilter) }} />
      ) : wide ? (
        <StepTable {...list} />
      ) : (
        <StepCards {...list} />
      )}
      <TextLink href={`/runs/${runId}/compare`} label="Compare with another run" />
      <Panel>
        <ChainHead events={events} />
      </Panel>
    </View>
  );
}

const optionsOf = (all: string, values: readonly string[]) => [
  { value: everything, label: all },
  ...values.map((value) => ({ value, label: value })),
];

function Filters({ rows, filter, onChange }: { rows: readonly StepRowView[]; filter: StepFilter; onChange: (filter: StepFilter) => void }) {
  const choices = useMemo(() => filterChoices(rows), [rows]);
  const active = filter !== noFilter && Object.values(filter).some((value) => value !== everything);
  return (
    <FilterGroup label="Filter of the step log" active={active} testID="filter">
      <View className="wide:w-[190px]">
        <Select
          label="Kind"
          value={filter.kind}
          options={optionsOf('every kind', choices.kind)}
          onChange={(kind) => onChange({ ...filter, kind })}
          testID="filter-kind"
        />
      </View>
      <View className="wide:w-[190px]">
        <Select
          label="Station"
          value={filter.station}
          options={optionsOf('every station', choices.station)}
          onChange={(station) => onChange({ ...filter, station })}
          testID="filter-station"
        />
      </View>
      <View className="wide:w-[190px]">
        <Select
          label="Outcome"
          value={filter.outcome}
          options={optionsOf('every outcome', choices.outcome)}
          onChange={(outcome) => onChange({ ...filter, outcome })}
          testID="filter-outcome"
        />
      </View>
    </FilterGroup>
  );
}
