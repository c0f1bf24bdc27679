import { useLocalSearchParams, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { addressOf, useLab, useLabQuery, wordsOf } from '@/components/api';
import { ReversalPlot } from '@/components/charts';
import { DownloadLink } from '@/components/runs/download-link';
import { Icon, Label, Loading, ProblemNotice, Screen, Section, Select, useWide } from '@/components/ui';
import { downloadReport, type EvaluationView, type ListedEvaluation } from '@/shared/contracts/evaluations';
import { downloadArchive, getRun, type RunView } from '@/shared/contracts/runs';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { AllanPanel } from './allan-panel';
import { BudgetPanel } from './budget-panel';
import { DriftsPanel } from './drifts-panel';
import { DwellList } from './dwell-list';
import { EvaluatePanel } from './evaluate-panel';
import { registeredWords, softwareWords } from './evaluation-words';
import { FiguresPanel } from './figures-panel';
import { FitPanel } from './fit-panel';
import { FreezePanel } from './freeze-panel';
import { GPanel } from './g-panel';
import { MethodsPanel } from './methods-panel';
import { SideBySidePanel } from './side-by-side-panel';
import { SurroundingsPanel } from './surroundings-panel';
import { TryPanel } from './try-panel';
import { WarningsPanel } from './warnings-panel';
import { useEvaluation, useEvaluations } from './use-evaluations';

/** The newest evaluation of a run, or an older one that is chosen: G, how well it is known and why, and everything it was made from. */
export function EvaluationScreen() {
  const { runId } = useLocalSearchParams<{ runId: string }>();
  const run = useLabQuery(getRun, { params: { runId } });
  const evaluations = useEvaluations(runId, run.data?.data.endedAt ?? null);
  const [chosen, setChosen] = useState<string | null>(null);
  const listed = evaluations.allDone.find(({ id }) => id === chosen) ?? evaluations.done;
  const full = useEvaluation(listed?.id ?? null);
  const view = run.data?.data ?? null;
  const failed = run.error ?? evaluations.list.error;
  const evaluation = full.data?.data ?? null;
  const panel = <EvaluatePanel runId={runId} evaluations={evaluations} registeredChannel={view?.protocol.evaluation?.channel ?? null} />;
  const back = { href: `/runs/${runId}` as Href, label: 'the run' };
  if (evaluation === null || evaluation.result === null || view === null || listed === null) {
    return (
      <Screen title="Evaluation" back={back}>
        {failed !== null ? (
          <ProblemNotice title="The evaluation could not be loaded" detail={wordsOf(failed).detail} />
        ) : run.isPending || evaluations.list.isPending || (evaluations.done !== null && full.isPending) ? (
          <Loading label="Loading the evaluation" />
        ) : (
          panel
        )}
      </Screen>
    );
  }
  return (
    <Evaluated
      key={listed.id}
      view={view}
      evaluation={evaluation}
      result={evaluation.result}
      panel={panel}
      back={back}
      choice={<Choice evaluations={evaluations.allDone} shown={listed.id} onChoose={setChosen} />}
      freeze={
        <FreezePanel
          evaluation={listed}
          recomputation={evaluations.recomputationOf(listed.id)}
          rig={view.rig}
          onChanged={evaluations.refresh}
        />
      }
    />
  );
}

interface EvaluatedProps {
  view: RunView;
  evaluation: EvaluationView;
  result: EvaluationResult;
  panel: React.ReactNode;
  back: { href: Href; label: string };
  choice: React.ReactNode;
  freeze: React.ReactNode;
}

function Evaluated({ view, evaluation, result, panel, back, choice, freeze }: EvaluatedProps) {
  const { labId, timeZone } = useLab();
  const wide = useWide();
  const curves = evaluation.curves ?? [];
  const [selected, setSelected] = useState<number | null>(curves[0]?.seq ?? null);
  const dwells = <DwellList dwells={result.dwells} selected={selected} onSelect={setSelected} />;
  const fit = <FitPanel runId={view.id} curves={curves} selected={selected} onSelect={setSelected} />;
  return (
    <Screen
      title="Evaluation"
      back={back}
      testID="evaluation-screen"
      asideOnlyWide
      aside={
        <>
          <View className="sticky top-0 z-10 bg-ink pb-2">{fit}</View>
          {dwells}
        </>
      }
    >
      {choice}
      <GPanel
        result={result}
        heading={view.rehearsal ? 'G of a rehearsal' : 'G of this run'}
        registered={registeredWords(result, view.protocol, evaluation.channel)}
        trueG={view.simulated?.trueG ?? null}
      />
      <FiguresPanel result={result} />
      <WarningsPanel
        warnings={result.warnings}
        firstLeftOut={result.dwells.find(({ used }) => !used)?.seq ?? null}
        run={view}
        onDwell={setSelected}
      />
      <Section title="Reversals" remark="Near − far of adjacent dwells; the band is the mean ± u.">
        <ReversalPlot result={result} />
      </Section>
      {wide ? null : fit}
      {wide ? null : dwells}
      <SideBySidePanel curves={curves} selected={selected} onSelect={setSelected} />
      <BudgetPanel result={result} rig={view.rig} />
      <TryPanel result={result} rig={view.rig} basis={evaluation.basis} />
      <MethodsPanel result={result} />
      <DriftsPanel result={result} />
      <AllanPanel curves={curves} />
      <SurroundingsPanel result={result} />
      <Chain chain={result.chain} />
      <View className="flex-row flex-wrap items-center gap-3">
        <DownloadLink
          framed
          label="Archive of the run"
          address={addressOf(downloadArchive, { params: { labId, runId: view.id } })}
          fileName={`evenfall-${view.id}.zip`}
          testID="archive"
        />
        {result.G === null ? null : (
          <DownloadLink
            framed
            label="Report (PDF)"
            address={addressOf(downloadReport, { params: { labId, evaluationId: evaluation.id } })}
            fileName={`evenfall-report-${evaluation.id.slice(0, 8)}.pdf`}
            testID="report"
          />
        )}
      </View>
      <Label>
        Evaluated {formatDayAndClock(Date.parse(evaluation.createdAt), timeZone)} by {evaluation.createdBy}
        {evaluation.channel === null ? '' : `, channel ${evaluation.channel}`}. {softwareWords(evaluation.software)}. Whoever has the
        archive can compute this again.
      </Label>
      {freeze}
      {panel}
    </Screen>
  );
}

interface ChoiceProps {
  evaluations: readonly ListedEvaluation[];
  shown: string;
  onChoose: (id: string) => void;
}

/** Which evaluation is shown, where the run has more than one. */
function Choice({ evaluations, shown, onChoose }: ChoiceProps) {
  const { timeZone } = useLab();
  if (evaluations.length < 2) return null;
  const options = evaluations.map(({ id, createdAt, createdBy, frozen }) => ({
    value: id,
    label: `${formatDayAndClock(Date.parse(createdAt), timeZone)} by ${createdBy}${frozen === null ? '' : ', frozen'}`,
  }));
  return <Select label="Evaluation" value={shown} options={options} onChange={onChoose} testID="which-evaluation" />;
}

function Chain({ chain }: { chain: EvaluationResult['chain'] }) {
  const whole = chain.valid === true;
  return (
    <View className="flex-row items-center gap-2" testID="chain">
      <Icon name={whole ? 'passed' : 'note'} size={18} tone={whole ? 'good' : 'dim'} />
      <Label className="shrink">
        {whole ? `The chain of ${chain.events} events is whole and unchanged.` : 'There is no event chain to check.'}
      </Label>
    </View>
  );
}
