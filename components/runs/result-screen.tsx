import { useMemo } from 'react';
import { View } from 'react-native';
import type { Href } from 'expo-router';
import { addressOf, useLab, useLabQuery } from '@/components/api';
import { stepsOfLog, SwingStrip } from '@/components/charts';
import { EvaluatePanel } from '@/components/evaluation/evaluate-panel';
import { registeredWords } from '@/components/evaluation/evaluation-words';
import { GPanel } from '@/components/evaluation/g-panel';
import { UncertainText } from '@/components/evaluation/uncertain-text';
import { useEvaluations } from '@/components/evaluation/use-evaluations';
import { Body, Chip, Icon, Label, Num, Panel, Screen, useWide } from '@/components/ui';
import { readSamples } from '@/shared/contracts/data';
import { downloadArchive, listSteps, type RunView, type StepRowView } from '@/shared/contracts/runs';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatDay, zoneName } from '@/shared/lib/format-time';
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
  const evaluations = useEvaluations(view.id);
  const result = evaluations.done?.result ?? null;
  return (
    <Screen
      title={titleOf(view, timeZone)}
      back={{ href: '/runs' as Href, label: 'Runs' }}
      trailing={<Chip tone={view.rehearsal ? 'lamp' : 'dim'}>{view.rehearsal ? 'rehearsal' : view.rigName}</Chip>}
      testID="result-screen"
    >
      <Headline view={view} timeZone={timeZone} />
      <LastStages view={view} timeZone={timeZone} />
      <WholeNight view={view} rows={rows} timeZone={timeZone} />
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
      <Figures view={view} rows={steps.data?.data.items ?? null} result={result} />
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

function Headline({ view, timeZone }: { view: RunView; timeZone: string }) {
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

/** `rows` is null until the step log is there: no dwell is called bad before. */
function Figures({ view, rows, result }: { view: RunView; rows: readonly StepRowView[] | null; result: EvaluationResult | null }) {
  const dwells = (rows ?? []).filter((row) => row.kind === 'dwell' && row.endUtcMs !== null);
  const good = dwells.filter((row) => row.good !== false && row.outcome === 'done').length;
  const reversal = result?.reversal_rad ?? null;
  return (
    <Panel className="flex-row flex-wrap gap-x-10 gap-y-4" testID="figures">
      <View>
        <Num size={20}>
          {rows === null ? '–' : good} of {view.dwellsPlanned}
        </Num>
        <Label>good dwells</Label>
      </View>
      {reversal === null ? null : (
        <View>
          <UncertainText
            size={20}
            value={reversal.value * 1e3}
            u={reversal.u === null ? null : reversal.u * 1e3}
            options={{ exponent: 0 }}
          />
          <Label>mrad near − far</Label>
        </View>
      )}
      {result?.period_s && result.dwells.some(({ used }) => used) ? (
        <View>
          <UncertainText size={20} {...result.period_s} />
          <Label>s damped period</Label>
        </View>
      ) : null}
    </Panel>
  );
}

function Links({ runId }: { runId: string }) {
  return (
    <View className="flex-row flex-wrap gap-1" role="navigation" aria-label="More of this run">
      <TextLink href={`/runs/${runId}/evaluation`} label="Evaluation" />
      <TextLink href={`/runs/${runId}/log`} label="Step log" />
      <TextLink href={`/runs/${runId}/data`} label="Deflection data" />
    </View>
  );
}
