import { useEffect, useMemo } from 'react';
import { View } from 'react-native';
import type { Href } from 'expo-router';
import { addressOf, useLab, useLabQuery, wordsOf } from '@/components/api';
import { stepsOfLog, SwingStrip } from '@/components/charts';
import { EvaluatePanel } from '@/components/evaluation/evaluate-panel';
import { registeredWords } from '@/components/evaluation/evaluation-words';
import { GPanel } from '@/components/evaluation/g-panel';
import { useEvaluations } from '@/components/evaluation/use-evaluations';
import { NightFigures } from '@/components/morning/believe';
import { NearFar, Pendulum } from '@/components/morning/nights';
import { RigNow } from '@/components/morning/rig-now';
import { Room } from '@/components/morning/room';
import { WhatNext, WorstMoments } from '@/components/morning/what-next';
import { Body, Chip, Icon, Label, Loading, Panel, ProblemNotice, Screen, useWide } from '@/components/ui';
import { readSamples } from '@/shared/contracts/data';
import { readMorning } from '@/shared/contracts/morning';
import { downloadArchive, listSteps, type RunView, type StepRowView } from '@/shared/contracts/runs';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatPercent } from '@/shared/lib/format-number';
import { formatDay, zoneName } from '@/shared/lib/format-time';
import { planWords } from '@/shared/morning/words';
import { toRad } from './deflection-series';
import { DownloadLink } from './download-link';
import { stagesOf } from './intervention';
import { InterventionStages } from './intervention-stages';
import { PairsPanel } from './pairs-panel';
import { TextLink } from './recent-steps';
import { RunAlarms } from './run-alarms';
import { outcomeTitle, stateMark } from './run-words';

/** A run that is over: how it ended, the whole night, and what it is worth so far. */
export function ResultScreen({ view }: { view: RunView }) {
  const { labId, timeZone } = useLab();
  const steps = useLabQuery(listSteps, { params: { runId: view.id } });
  const rows = steps.data?.data.items ?? [];
  const evaluations = useEvaluations(view.id, view.endedAt);
  const result = evaluations.done?.result ?? null;
  const morning = useMorning(view.id, evaluations.done?.id ?? null);
  const sheet = morning.data?.data ?? null;
  const wide = useWide();
  const atOnce = (
    <>
      {view.rehearsal ? null : <RigNow rigId={view.rigId} timeZone={timeZone} />}
      {sheet === null ? <SheetState morning={morning} /> : <NightFigures sheet={sheet} />}
    </>
  );
  const next = sheet === null ? null : <WhatNext next={sheet.next} />;
  return (
    <Screen
      title={titleOf(view, timeZone)}
      back={{ href: '/runs' as Href, label: 'Runs' }}
      trailing={<Chip tone={view.rehearsal ? 'lamp' : 'dim'}>{view.rehearsal ? 'rehearsal' : view.rigName}</Chip>}
      asideOnlyWide
      aside={
        <>
          {atOnce}
          {next}
        </>
      }
      testID="result-screen"
    >
      <Headline view={view} plan={sheet === null ? '' : planWords(sheet, view.endedAt)} timeZone={timeZone} />
      <LastStages view={view} timeZone={timeZone} />
      {wide ? null : atOnce}
      <WholeNight view={view} rows={rows} timeZone={timeZone} />
      {sheet === null ? null : <NearFar sheet={sheet} rehearsal={view.rehearsal} timeZone={timeZone} />}
      {result === null ? (
        <EvaluatePanel runId={view.id} evaluations={evaluations} registeredChannel={view.protocol.evaluation?.channel ?? null} />
      ) : (
        <GPanel
          heading="G so far"
          result={result}
          registered={registeredWords(result, view.protocol, evaluations.done?.channel ?? null)}
          trueG={view.simulated?.trueG ?? null}
        />
      )}
      {sheet?.shares == null ? null : (
        <Label testID="shares">
          Of u²(G) the night has {formatPercent(Math.max(0, sheet.shares.night))}, the geometry of the rig{' '}
          {formatPercent(Math.max(0, sheet.shares.geometry))}.
        </Label>
      )}
      {wide ? null : next}
      {sheet === null ? null : <WorstMoments worst={sheet.worst} runId={view.id} timeZone={timeZone} />}
      {sheet === null ? null : <Pendulum sheet={sheet} />}
      {sheet === null ? null : <Room room={sheet.room} />}
      <PairsPanel runId={view.id} rows={rows} timeZone={timeZone} />
      <RunAlarms runId={view.id} startedAt={view.startedAt} rehearsal={view.rehearsal} />
      <Links runId={view.id} />
      <View className="flex-row flex-wrap items-center gap-3">
        <DownloadLink
          framed
          label="Archive of the run"
          address={addressOf(downloadArchive, { params: { labId, runId: view.id } })}
          fileName={`evenfall-${view.id}.zip`}
          testID="archive"
        />
      </View>
      <Label>
        {view.protocolName}
        {view.protocolRevision > 0 ? `, revision ${view.protocolRevision}` : ''}, on {view.rigName}; mass set: {view.massSetLabel}; by{' '}
        {view.operator}.
      </Label>
      {view.notes === '' ? null : <Body>{view.notes}</Body>}
    </Screen>
  );
}

function titleOf(view: RunView, timeZone: string): string {
  const start = Date.parse(view.startedAt ?? view.createdAt);
  return `${view.rehearsal ? 'Rehearsal' : 'Run'} of ${formatDay(start, timeZone)}`;
}

/** Read anew once another evaluation is there. */
function useMorning(runId: string, evaluationId: string | null) {
  const morning = useLabQuery(readMorning, { params: { runId } });
  const { refetch } = morning;
  useEffect(() => void (evaluationId === null ? undefined : refetch()), [evaluationId, refetch]);
  return morning;
}

/** The rest of the page does not wait for the sheet, nor fall with it. */
function SheetState({ morning }: { morning: ReturnType<typeof useMorning> }) {
  if (!morning.isError) return <Loading label="Reading the night" />;
  return (
    <ProblemNotice
      title="The morning sheet could not be made"
      detail={wordsOf(morning.error).detail}
      action={{ label: 'Try again', onPress: () => void morning.refetch() }}
    />
  );
}

function Headline({ view, plan, timeZone }: { view: RunView; plan: string; timeZone: string }) {
  const mark = stateMark(view.state);
  const lengthS = view.startedAt !== null && view.endedAt !== null ? (Date.parse(view.endedAt) - Date.parse(view.startedAt)) / 1000 : null;
  return (
    <View className="gap-1" role="status" testID="headline">
      <View className="flex-row items-center gap-3">
        <Icon name={mark.icon} size={30} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
        <Body size={30} strong className="min-w-0 shrink">
          {outcomeTitle(view, timeZone)}
        </Body>
      </View>
      <Label>
        {zoneName(timeZone)}
        {lengthS === null ? '' : `, after ${formatDuration(lengthS)}`}
        {plan === '' ? '' : `, ${plan}`}
      </Label>
      {view.reason === '' ? null : <Body>{view.reason}</Body>}
    </View>
  );
}

/** Whoever has just stopped the run sees here that the controller confirmed it. */
function LastStages({ view, timeZone }: { view: RunView; timeZone: string }) {
  const stages = stagesOf({ kind: 'idle' }, view.intervention, view.state);
  if (stages === null) return null;
  return (
    <Panel>
      <InterventionStages stages={stages} timeZone={timeZone} />
    </Panel>
  );
}

function WholeNight({ view, rows, timeZone }: { view: RunView; rows: readonly StepRowView[]; timeZone: string }) {
  const wide = useWide();
  const samples = useLabQuery(readSamples, { params: { runId: view.id }, query: { points: 2000 } });
  const data = samples.data?.data ?? null;
  const strip = useMemo(() => stepsOfLog(rows), [rows]);
  const measured = useMemo(() => {
    const y = data?.channel ? toRad(data.value, data.channel.unit, view.rig) : null;
    return data && y ? { x: data.utcMs, y } : null;
  }, [data, view.rig]);
  if (rows.length === 0) return null;
  return (
    <Panel className="gap-1" testID="night-strip">
      <SwingStrip
        steps={strip}
        timeZone={timeZone}
        title={`${view.rigName}, the whole run`}
        measured={measured}
        heightPx={wide ? 170 : 130}
      />
      {data !== null && data.total === 0 ? <Label>No deflection data yet.</Label> : null}
    </Panel>
  );
}

function Links({ runId }: { runId: string }) {
  return (
    <View className="flex-row flex-wrap gap-1" role="navigation" aria-label="More of this run">
      <TextLink href={`/runs/${runId}/evaluation`} label="Evaluation" />
      <TextLink href={`/runs/${runId}/log`} label="Step log" />
      <TextLink href={`/runs/${runId}/replay`} label="Replay" />
      <TextLink href={`/runs/${runId}/data`} label="Deflection data" />
    </View>
  );
}
