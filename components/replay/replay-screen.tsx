import { router, useLocalSearchParams, type Href } from 'expo-router';
import { useMemo, useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabQuery, wordsOf } from '@/components/api';
import { useFrames } from '@/components/cameras/use-cameras';
import { PlanView, stepsOfLog, SwingStrip, type Series } from '@/components/charts';
import { reducedMotion } from '@/components/charts/use-smooth-angle';
import { toRad } from '@/components/runs/deflection-series';
import { stepTitle } from '@/components/runs/run-words';
import { Body, Button, Empty, IconButton, Label, Loading, Num, Panel, ProblemNotice, Screen, Tabs, useWide } from '@/components/ui';
import { TextLink } from '@/components/runs/recent-steps';
import { listRunAlarms, type RunAlarm } from '@/shared/contracts/alarms';
import { readSamples, type ChannelView } from '@/shared/contracts/data';
import { getRun, listSteps, type RunView, type StepRowView } from '@/shared/contracts/runs';
import { formatDeflection, formatDegrees } from '@/shared/lib/format-angle';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import { momentAt, neighbourStart } from './moment';
import { ReplayAlarms, StandingAlarms } from './replay-alarms';
import { ReplayCamera } from './replay-camera';
import { ReplaySurroundings } from './replay-surroundings';
import { TimeSlider } from './time-slider';
import { usePlayer } from './use-player';

/** The night in a minute: table, deflection and step log in step, under one thumb. */
export function ReplayScreen() {
  const { runId, at } = useLocalSearchParams<{ runId: string; at?: string }>();
  const run = useLabQuery(getRun, { params: { runId } });
  const steps = useLabQuery(listSteps, { params: { runId } });
  const samples = useLabQuery(readSamples, { params: { runId }, query: { points: 4000 } });
  const view = run.data?.data ?? null;
  const rows = steps.data?.data.items ?? null;
  const data = samples.data?.data ?? null;
  const measured = useMemo(() => {
    const y = view !== null && data?.channel ? toRad(data.value, data.channel.unit, view.rig) : null;
    return data && y ? { x: data.utcMs, y } : null;
  }, [data, view]);
  const failed = [run, steps, samples].find(({ isError }) => isError);
  const startUtcMs = at === undefined || Number.isNaN(Date.parse(at)) ? null : Date.parse(at);
  return (
    <Screen title="Replay" back={{ href: `/runs/${runId}` as Href, label: view?.rigName ?? 'the run' }} testID="replay-screen">
      {failed !== undefined ? (
        <ProblemNotice
          title="The night could not be loaded"
          detail={wordsOf(failed.error).detail}
          action={{ label: 'Try again', onPress: () => void failed.refetch() }}
        />
      ) : view === null || rows === null || samples.isPending ? (
        <Loading label="Loading the night" />
      ) : rows.length === 0 ? (
        <Empty title="Nothing to replay yet">The run has not begun its first step.</Empty>
      ) : (
        <Night view={view} rows={rows} measured={measured} channels={data?.channels ?? []} startUtcMs={startUtcMs} />
      )}
    </Screen>
  );
}

interface NightProps {
  view: RunView;
  rows: readonly StepRowView[];
  measured: Series | null;
  channels: readonly ChannelView[];
  startUtcMs: number | null;
}

const noAlarms: readonly RunAlarm[] = [];

const isoSecond = (utcMs: number) => new Date(Math.floor(utcMs / 1000) * 1000).toISOString();

type Pace = '20' | '60' | '180';
const paces: { value: Pace; label: string }[] = [
  { value: '180', label: 'in 3 min' },
  { value: '60', label: 'in 1 min' },
  { value: '20', label: 'in 20 s' },
];

function Night({ view, rows, measured, channels, startUtcMs }: NightProps) {
  const { timeZone } = useLab();
  const wide = useWide();
  const frames = useFrames(view.id);
  const alarms = useLabQuery(listRunAlarms, { params: { runId: view.id }, enabled: !view.rehearsal }).data?.data.items ?? noAlarms;
  const [pace, setPace] = useState<Pace>('60');
  const strip = useMemo(() => stepsOfLog(rows), [rows]);
  const fromUtcMs = strip[0]?.startUtcMs ?? 0;
  const toUtcMs = strip.at(-1)?.endUtcMs ?? fromUtcMs;
  // Less than a pixel: the strip is drawn anew only where it would look different.
  const strideMs = Math.max(1, (toUtcMs - fromUtcMs) / 1000);
  const jump = useMemo(() => (reducedMotion() ? (utcMs: number) => neighbourStart(rows, utcMs, 1) : null), [rows]);
  const { atUtcMs, playing, toggle, go } = usePlayer({ fromUtcMs, toUtcMs, startUtcMs, wholeS: Number(pace), jump });
  const shownUtcMs = fromUtcMs + strideMs * Math.floor((atUtcMs - fromUtcMs) / strideMs);
  const around = useMemo(() => channels.filter(({ role }) => role === 'environment'), [channels]);
  const { row, between, angleDeg, rad } = momentAt({ rows, measured, rig: view.rig }, atUtcMs);
  const marks = useMemo(
    () => alarms.map(({ raisedAt }) => Date.parse(raisedAt)).filter((raised) => raised >= fromUtcMs && raised <= toUtcMs),
    [alarms, fromUtcMs, toUtcMs],
  );
  const link = (utcMs: number) => router.setParams({ at: isoSecond(utcMs) });
  const step = (by: 1 | -1) => go(neighbourStart(rows, atUtcMs, by) ?? (by === 1 ? toUtcMs : fromUtcMs));
  return (
    <View className="gap-4">
      <View className="gap-4 wide:flex-row">
        <Panel className={wide ? 'flex-1 flex-row items-center gap-8' : 'flex-row items-center gap-4'}>
          <PlanView rig={view.rig} angleDeg={angleDeg} sizePx={wide ? (frames.length === 0 ? 260 : 200) : 132} />
          <View className="min-w-0 shrink gap-2">
            <Num size={24} testID="replay-clock">
              {formatClock(atUtcMs, { timeZone, precision: 'seconds' })}
            </Num>
            <Label>{zoneName(timeZone)}</Label>
            <Body testID="replay-step">
              {row === null ? 'Before the first step' : between ? 'Held, between two steps' : stepTitle(row, view.protocol)}
            </Body>
            <Label>
              turntable <Num size={13}>{formatDegrees(angleDeg)}</Num>
            </Label>
            <Label>
              deflection <Num size={13}>{formatDeflection(rad)}</Num>
            </Label>
            <StandingAlarms alarms={alarms} atUtcMs={atUtcMs} />
          </View>
        </Panel>
        <ReplayCamera runId={view.id} frames={frames} atUtcMs={atUtcMs} />
      </View>
      <Panel className="gap-2">
        <SwingStrip
          steps={strip}
          timeZone={timeZone}
          title={`${view.rigName}, the whole run`}
          measured={measured}
          nowUtcMs={shownUtcMs}
          heightPx={wide ? 190 : 140}
        />
        <ReplaySurroundings runId={view.id} channels={around} fromUtcMs={fromUtcMs} toUtcMs={toUtcMs} atUtcMs={shownUtcMs} />
        <TimeSlider {...{ fromUtcMs, toUtcMs, atUtcMs, timeZone, marks }} onChange={go} onStep={step} />
        <View className="flex-row items-center justify-between gap-2">
          <IconButton icon="back" label="Previous step" onPress={() => step(-1)} testID="replay-previous" />
          <Button icon={playing ? 'hold' : 'start'} label={playing ? 'Pause' : 'Play'} onPress={toggle} testID="replay-play" />
          <IconButton icon="forward" label="Next step" onPress={() => step(1)} testID="replay-next" />
        </View>
        <Tabs label="The whole night" value={pace} onChange={setPace} options={paces} testID="replay-pace" />
        {jump === null ? null : <Label>Motion is reduced on this device: it goes from step to step, one a second.</Label>}
      </Panel>
      <ReplayAlarms alarms={alarms} atUtcMs={atUtcMs} onGo={go} />
      <View className="flex-row flex-wrap items-center gap-x-3">
        <Button kind="quiet" icon="mark" label="Put this moment into the address" onPress={() => link(atUtcMs)} testID="replay-link" />
        <TextLink href={`/runs/${view.id}/data?at=${isoSecond(atUtcMs)}`} label="The data at this moment" />
      </View>
    </View>
  );
}
