import { keepPreviousData, useQuery } from '@tanstack/react-query';
import { router, useLocalSearchParams, type Href } from 'expo-router';
import { useCallback, useMemo, useState } from 'react';
import { View } from 'react-native';
import { call, labKey, useLab, useLabQuery, useMay, wordsOf } from '@/components/api';
import { standsOf, stepsOfLog } from '@/components/charts';
import { DeflectionPlot } from '@/components/charts/deflection-plot';
import type { StepBand } from '@/components/charts/deflection-plot-types';
import { useCalm } from '@/components/runs/use-now';
import { Button, Empty, Label, Loading, Panel, ProblemNotice, Screen, Section, Select, useWide } from '@/components/ui';
import { readSamples } from '@/shared/contracts/data';
import type { ExclusionView } from '@/shared/contracts/exclusions';
import { listSteps, type StepRowView } from '@/shared/contracts/runs';
import { formatFixed, unitSign } from '@/shared/lib/format-number';
import { ExclusionList, useExclusions } from './exclusion-list';
import { ExportLinks, type Span } from './export-links';
import { KeptFiles } from './kept-files';

const points = 3000;

function bandsOf(rows: readonly StepRowView[]): StepBand[] {
  return standsOf(stepsOfLog(rows)).map(({ lane, startUtcMs, endUtcMs, good }) => ({
    lane,
    fromUtcMs: startUtcMs,
    toUtcMs: endUtcMs,
    good,
  }));
}

/** The deflection of a run against the steps that moved the masses, as close as one likes. */
export function DataScreen() {
  const { runId, channel: asked } = useLocalSearchParams<{ runId: string; channel?: string }>();
  const may = useMay('data.import');
  const whole = useLabQuery(readSamples, { params: { runId }, query: { points } });
  const channels = (whole.data?.data.channels ?? []).filter((channel) => channel.role === 'deflection');
  const [chosen, setChosen] = useState<string | null>(null);
  const wanted = chosen ?? asked ?? null;
  const channelId = channels.find(({ id }) => id === wanted)?.id ?? whole.data?.data.channel?.id ?? null;
  const toImport = () => router.push(`/runs/${runId}/import` as Href);
  return (
    <Screen title="Deflection data" back={{ href: `/runs/${runId}` as Href, label: 'the run' }} testID="data-screen">
      {whole.isPending ? <Loading label="Loading the data" /> : null}
      {whole.isError ? (
        <ProblemNotice
          title="The data could not be loaded"
          detail={wordsOf(whole.error).detail}
          action={{ label: 'Try again', onPress: () => void whole.refetch() }}
        />
      ) : null}
      {whole.isSuccess && channels.length === 0 ? (
        <Empty
          title="No deflection data"
          icon="runs"
          action={may.ok ? { label: 'Import a file', icon: 'import', onPress: toImport } : undefined}
        >
          {may.ok ? 'Bring in the readings of the balance as a text file; they are laid against the step log.' : may.why}
        </Empty>
      ) : null}
      {channelId === null || channels.length === 0 ? null : (
        <>
          {channels.length > 1 ? (
            <View className="wide:w-[320px]">
              <Select
                label="Channel"
                value={channelId}
                options={channels.map(({ id, name, unit }) => ({ value: id, label: `${name}, ${unitSign(unit)}` }))}
                onChange={setChosen}
                testID="channel"
              />
            </View>
          ) : null}
          <ChannelPlot key={channelId} runId={runId} channelId={channelId} />
          <Excluded runId={runId} />
          <KeptFiles runId={runId} channels={channels} />
          <Button icon="import" label="Import a file" disabled={!may.ok} onPress={toImport} className="self-start" testID="to-import" />
          {may.ok ? null : <Label>{may.why}</Label>}
        </>
      )}
    </Screen>
  );
}

/** What evaluations do without, and where more can be excluded. */
function Excluded({ runId }: { runId: string }) {
  const exclusions = useExclusions(runId);
  return (
    <Section
      title="Excluded by hand"
      remark="Open a row of the step log to exclude its samples, or a part of them, with a reason. Evaluations asked for afterwards do without them."
    >
      {exclusions.exclusions.length === 0 && exclusions.error === null ? (
        <Label testID="nothing-excluded">Nothing is or was excluded.</Label>
      ) : (
        <Panel>
          <ExclusionList {...exclusions} />
        </Panel>
      )}
      <Button label="Step log" onPress={() => router.push(`/runs/${runId}/log` as Href)} className="self-start" testID="to-log" />
    </Section>
  );
}

const spansInForce = (exclusions: readonly ExclusionView[]) =>
  exclusions.filter(({ withdrawn }) => withdrawn === null).map(({ startUtcMs, endUtcMs }) => ({ from: startUtcMs, to: endUtcMs }));

/** Samples of a part of the run, thinned by the server to what can be drawn. */
function useSamples(runId: string, channelId: string, span: Span | null) {
  const { labId } = useLab();
  const query = { channelId, points, ...(span ?? {}) };
  return useQuery({
    queryKey: [...labKey(labId, readSamples), { runId }, query],
    queryFn: ({ signal }) => call(readSamples, { params: { labId, runId }, query, signal }),
    placeholderData: keepPreviousData,
    staleTime: 30_000,
  });
}

function ChannelPlot({ runId, channelId }: { runId: string; channelId: string }) {
  const { timeZone } = useLab();
  const wide = useWide();
  const steps = useLabQuery(listSteps, { params: { runId } });
  const all = useSamples(runId, channelId, null);
  const [span, setSpan] = useState('');
  const wanted = useCalm(span, 400);
  const detail = useSamples(runId, channelId, wanted === '' ? null : parseSpan(wanted));
  const rows = steps.data?.data.items;
  const bands = useMemo(() => bandsOf(rows ?? []), [rows]);
  const { exclusions } = useExclusions(runId);
  const excluded = useMemo(() => spansInForce(exclusions), [exclusions]);
  const coarse = all.data?.data;
  const first = coarse?.utcMs[0];
  const last = coarse?.utcMs.at(-1);
  const onWindow = useCallback(
    (from: number, to: number) =>
      setSpan(first !== undefined && last !== undefined && from <= first && to >= last ? '' : `${Math.floor(from)} ${Math.ceil(to)}`),
    [first, last],
  );
  if (!coarse?.channel || first === undefined || last === undefined)
    return all.isPending ? <Loading label="Loading the data" /> : <Empty title="No samples in this run" />;
  const shown = detail.data?.data ?? coarse;
  return (
    <Panel className="gap-2" testID="channel-plot">
      <DeflectionPlot
        utcMs={shown.utcMs}
        value={shown.value}
        unit={coarse.channel.unit}
        timeZone={timeZone}
        bands={bands}
        excluded={excluded}
        heightPx={wide ? 420 : 300}
        whole={{ from: first, to: last }}
        onWindow={onWindow}
        title={`${coarse.channel.name} over the run, with the stands at near above and at far below${excluded.length === 0 ? '' : `; ${String(excluded.length)} excluded, hatched`}`}
      />
      <Label>
        {formatFixed(coarse.total, { decimals: 0 })} samples
        {coarse.total > coarse.utcMs.length ? '; least and greatest of each stretch are drawn, all of them when you look closer' : ''}.
      </Label>
      <ExportLinks channel={coarse.channel} whole={{ fromUtcMs: first, toUtcMs: last }} shown={wanted === '' ? null : parseSpan(wanted)} />
    </Panel>
  );
}

function parseSpan(text: string): Span {
  const [fromUtcMs = 0, toUtcMs = 0] = text.split(' ').map(Number);
  return { fromUtcMs, toUtcMs };
}
