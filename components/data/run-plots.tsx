import { router, useLocalSearchParams, useNavigation } from 'expo-router';
import { useEffect, useMemo, useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabQuery } from '@/components/api';
import { standsOf, stepsOfLog } from '@/components/charts';
import { drawnMark } from '@/components/charts/marking';
import { keysOf, TimeControls } from '@/components/charts/time-controls';
import { TimePlot } from '@/components/charts/time-plot';
import { axisUnit, type StepBand, type TimeSpan } from '@/components/charts/time-plot-types';
import { useTimeView } from '@/components/charts/use-time-view';
import { TextLink } from '@/components/runs/recent-steps';
import { useCalm } from '@/components/runs/use-now';
import { Body, Empty, Label, Loading, Num, Panel, Sheet, useWide } from '@/components/ui';
import type { ChannelView } from '@/shared/contracts/data';
import type { ExclusionView } from '@/shared/contracts/exclusions';
import { listSteps, type StepRowView } from '@/shared/contracts/runs';
import { formatFixed } from '@/shared/lib/format-number';
import { ExcludeSheet } from './exclude-sheet';
import { ExclusionList, type Exclusions } from './exclusion-list';
import { ExportLinks } from './export-links';
import { MarkBar, useMarking } from './mark-bar';
import { ChannelPane, Pane, seriesOf, useReadingWords, type Linked, type PlottedSeries } from './plotted-channel';
import { excludedWords, touching } from './stretch';
import { ThinnedNote } from './thinned-note';
import { turntableSeries } from './turntable-series';
import { useRunSamples } from './use-run-samples';
import { readAddress, writePanes, writeStretch, type AddressParams } from './view-address';

const noRows: readonly StepRowView[] = [];
/** The turntable among the panes: no channel has such a name. */
const turntableId = 'turntable';
/** So many channels of the surroundings are open where nobody has chosen. */
const usuallyOpen = { wide: 3, narrow: 1 };
const paneHeightPx = { wide: 132, narrow: 112 };

const bandsOf = (rows: readonly StepRowView[]): StepBand[] =>
  standsOf(stepsOfLog(rows)).map(({ lane, startUtcMs, endUtcMs, good }) => ({ lane, fromUtcMs: startUtcMs, toUtcMs: endUtcMs, good }));

const spansInForce = (exclusions: readonly ExclusionView[]) =>
  exclusions.filter(({ withdrawn }) => withdrawn === null).map(({ startUtcMs, endUtcMs }) => ({ from: startUtcMs, to: endUtcMs }));

interface RunPlotsProps {
  runId: string;
  channel: ChannelView;
  /** Of the surroundings, and whatever else is recorded beside the deflection. */
  others: readonly ChannelView[];
  exclusions: Exclusions;
}

/** The deflection of a run with the steps, and the surroundings under it on the same time axis. */
export function RunPlots(props: RunPlotsProps) {
  const { runId, channel } = props;
  const all = useRunSamples(runId, channel.id);
  const coarse = all.data?.data;
  const [from, to] = [coarse?.utcMs[0], coarse?.utcMs.at(-1)];
  if (coarse === undefined) return <Loading label="Loading the data" />;
  if (from === undefined || to === undefined) return <Empty title="No samples in this run" />;
  return <LinkedPlots {...props} coarse={coarse} whole={{ from, to }} />;
}

/** What the linked plots show is kept in the address, so that a link leads to it. */
function useAddressedView(whole: TimeSpan) {
  const params = useLocalSearchParams<AddressParams & Record<string, string>>();
  const navigation = useNavigation<{ setParams: (params: AddressParams) => void }>();
  const [start] = useState(() => readAddress(params));
  const hand = useTimeView(whole, start);
  const { from, to } = hand.span;
  const text = useCalm(hand.shownAll ? '' : `${String(from)} ${String(to)}`, 400);
  const wanted = useMemo(() => {
    const [begin, end] = text.split(' ').map(Number);
    return begin === undefined || end === undefined ? null : { from: begin, to: end };
  }, [text]);
  const stretch = useMemo(() => writeStretch(wanted), [wanted]);
  const isWritten = params.from === stretch.from && params.to === stretch.to;
  useEffect(() => {
    if (!isWritten) navigation.setParams({ ...stretch, at: undefined });
  }, [stretch, isWritten, navigation]);
  return { hand, wanted, panes: readAddress({ panes: params.panes }).panes };
}

type Samples = NonNullable<ReturnType<typeof useRunSamples>['data']>['data'];
/** `coarse`: the whole run, which is drawn until the stretch that is asked for has come. */
type LinkedPlotsProps = RunPlotsProps & { coarse: Samples; whole: TimeSpan };

function LinkedPlots({ runId, channel, others, exclusions, coarse, whole }: LinkedPlotsProps) {
  const { timeZone } = useLab();
  const wide = useWide();
  const { hand, wanted, panes } = useAddressedView(whole);
  const mark = useMarking();
  const [excludes, setExcludes] = useState<TimeSpan | null>(null);
  const [tapped, setTapped] = useState<readonly string[]>([]);
  const rows = useLabQuery(listSteps, { params: { runId } }).data?.data.items ?? noRows;
  const samples = useRunSamples(runId, channel.id, { span: wanted }).data?.data ?? coarse;
  const series = useMemo<PlottedSeries>(() => seriesOf(samples, channel.unit), [samples, channel.unit]);
  const words = useReadingWords(series, hand.cursor);
  const told = excludedWords(exclusions.exclusions, timeZone);
  const linked: Linked = {
    view: hand,
    bands: useMemo(() => bandsOf(rows), [rows]),
    excluded: useMemo(() => spansInForce(exclusions.exclusions), [exclusions.exclusions]),
    marked: useMemo(() => (mark.marking === null ? null : drawnMark(mark.marking, whole)), [mark.marking, whole]),
    painter: mark.painter,
    onTap: (at, reach) => setTapped(idsAbout(exclusions.exclusions, at, reach)),
    onKey: (key) => {
      if (key === 'Enter' && hand.cursor !== null) {
        if (mark.marking === null) setTapped(idsAbout(exclusions.exclusions, hand.cursor, 0));
        else mark.setEnd(hand.cursor);
        return true;
      }
      if (key === 'Escape' && mark.marking !== null) mark.leave();
      const act = keysOf(hand, mark.marking !== null)[key];
      act?.();
      return act !== undefined;
    },
    keyWords: 'Arrow keys move, with Shift the cursor, plus and minus zoom, Home shows all, Enter opens what is excluded at the cursor.',
  };
  return (
    <Panel className="gap-2" testID="channel-plot">
      <TimeControls hand={hand} timeZone={timeZone} />
      <View className="flex-row flex-wrap items-baseline justify-between gap-x-3">
        <Body strong>
          {channel.name}, {axisUnit(channel.unit)}
        </Body>
        {words === '' ? null : <Num testID="plot-reading">{words}</Num>}
      </View>
      <TimePlot
        {...series}
        {...linked}
        timeZone={timeZone}
        heightPx={wide ? 380 : 280}
        title={`${channel.name} over the run, with the stands at near above and at far below${told === '' ? '' : `; ${told}`}`}
        testID="deflection-plot"
      />
      <MarkBar
        mark={mark}
        whole={whole}
        cursor={hand.cursor}
        onBegin={() => {
          mark.begin();
          // Whoever marks by keys goes on there.
          document.querySelector<HTMLElement>('[data-testid="deflection-plot"] [role="img"]')?.focus();
        }}
        onExclude={setExcludes}
      />
      <Panes {...{ runId, others, rows, linked, wanted, panes }} />
      <Label>
        {formatFixed(coarse.total, { decimals: 0 })} samples
        {coarse.total > coarse.utcMs.length ? '; least and greatest of each stretch are drawn, all of them when you look closer' : ''}. In
        brackets: how far single readings scatter about there (k = 1)
        {samples.calibration === null ? '' : `, with the u of their calibration, revision ${String(samples.calibration.revision)}`}.
      </Label>
      <ThinnedNote thinned={samples.thinned} />
      {hand.cursor === null ? null : (
        <View className="flex-row">
          <TextLink href={`/runs/${runId}/replay?at=${new Date(hand.cursor).toISOString()}`} label="This moment in the replay" />
        </View>
      )}
      <ExportLinks channel={channel} whole={spanOf(whole)} shown={wanted === null ? null : spanOf(wanted)} />
      {excludes === null ? null : (
        <ExcludeSheet
          runId={runId}
          step={{ startUtcMs: excludes.from, endUtcMs: excludes.to }}
          of="what is marked"
          title="Exclude what is marked"
          onClose={() => setExcludes(null)}
          onDone={() => {
            mark.leave();
            exclusions.onChanged();
          }}
        />
      )}
      {tapped.length === 0 ? null : <TappedExclusions exclusions={exclusions} ids={tapped} onClose={() => setTapped([])} />}
    </Panel>
  );
}

const spanOf = ({ from, to }: TimeSpan) => ({ fromUtcMs: from, toUtcMs: to });

/** Those in force within reach of an instant, ms. */
const idsAbout = (exclusions: readonly ExclusionView[], utcMs: number, reachMs: number) =>
  touching(exclusions, { startUtcMs: utcMs - reachMs - 1, endUtcMs: utcMs + reachMs + 1 }).flatMap(({ id, withdrawn }) =>
    withdrawn === null ? [id] : [],
  );

/** What was found excluded under a finger: why, by whom, and withdrawing it. */
function TappedExclusions({ exclusions, ids, onClose }: { exclusions: Exclusions; ids: readonly string[]; onClose: () => void }) {
  return (
    <Sheet open title="Excluded here" onClose={onClose} testID="tapped-exclusion">
      <ExclusionList {...exclusions} exclusions={exclusions.exclusions.filter(({ id }) => ids.includes(id))} />
    </Sheet>
  );
}

interface PanesProps extends Pick<RunPlotsProps, 'runId' | 'others'> {
  rows: readonly StepRowView[];
  linked: Linked;
  wanted: TimeSpan | null;
  /** As the address has it. */
  panes: readonly string[] | null;
}

function Panes({ runId, others, rows, linked, wanted, panes }: PanesProps) {
  const wide = useWide();
  const turntable = useMemo(() => turntableSeries(rows), [rows]);
  const open = panes ?? others.slice(0, wide ? usuallyOpen.wide : usuallyOpen.narrow).map(({ id }) => id);
  const toggle = (id: string) =>
    router.setParams({ panes: writePanes(open.includes(id) ? open.filter((one) => one !== id) : [...open, id]) });
  const heightPx = wide ? paneHeightPx.wide : paneHeightPx.narrow;
  const about = (id: string) => ({ open: open.includes(id), onToggle: () => toggle(id), linked, heightPx });
  return (
    <View testID="panes">
      {others.map((channel) => (
        <ChannelPane key={channel.id} runId={runId} channel={channel} wanted={wanted} {...about(channel.id)} />
      ))}
      {turntable === null ? null : <Pane name={turntableId} title="Turntable" series={turntable} empty="" {...about(turntableId)} />}
    </View>
  );
}
