import { useLocalSearchParams, type Href } from 'expo-router';
import { useEffect, useRef } from 'react';
import { View } from 'react-native';
import { isProblem, useLab, wordsOf } from '@/components/api';
import { Chip, Label, Loading, Panel, ProblemNotice, Screen, useWide } from '@/components/ui';
import { RunCameras } from '@/components/cameras/run-cameras';
import type { RunView } from '@/shared/contracts/runs';
import { PositionFacts } from '@/components/rigs/position-facts';
import { LockedNotice } from '@/components/rigs/lock-panel';
import { AfterDwell } from './after-dwell';
import { FinishEarly } from './finish-early';
import { ControlBar } from './control-bar';
import { HeldNotice } from './held-notice';
import { linkAge } from './link-age';
import { LinkChip, LostNotice } from './link-chip';
import { serverOffsetMs } from './live-reducer';
import { LiveStrip } from './live-strip';
import { PlanPanel } from './plan-panel';
import { QuarantineScreen } from './quarantine-screen';
import { RecentSteps, TextLink } from './recent-steps';
import { ResultScreen } from './result-screen';
import { RehearsalAtWork } from './rehearsal-at-work';
import { RunHead } from './run-head';
import { isOver } from './run-words';
import { useIntervention } from './use-intervention';
import { useLiveRun, type LiveRun } from './use-live-run';
import { useNow } from './use-now';
import { Surroundings } from './surroundings';
import { ReachedPanel, WaitingPanel } from './waiting-panel';
import { useRunStrip } from './use-run-strip';

const askAgainMs = 3000;
const back = { href: '/runs' as Href, label: 'Runs' };

/** A run: watched and held or stopped while it goes on, summed up once it is over. */
export function RunScreen() {
  const { runId } = useLocalSearchParams<{ runId: string }>();
  const live = useLiveRun(runId);
  const { view } = live.state;
  if (view === null) {
    return (
      <Screen title="Run" back={back} footer={canAct(live.error) ? <BlindControls runId={runId} /> : undefined}>
        {live.error === null ? (
          <Loading label="Loading the run" />
        ) : (
          <ProblemNotice
            title="The run could not be loaded"
            detail={wordsOf(live.error).detail}
            action={{ label: 'Try again', onPress: live.refresh }}
          />
        )}
      </Screen>
    );
  }
  if (view.state === 'rehearsing') return <RehearsalAtWork view={view} refresh={live.refresh} />;
  if (isOver(view.state)) return <ResultScreen view={view} />;
  if (view.quarantine === null) return <LiveScreen view={view} live={live} />;
  return <QuarantineScreen view={view} quarantine={view.quarantine} beat={live.state.beat} refresh={live.refresh} />;
}

/** Whether a run may be there although it cannot be shown. */
const canAct = (error: unknown) => error !== null && !isProblem(error, 'not-found') && !isProblem(error, 'not-allowed');

/** Hold and stop of a run of which nothing is known here: neither needs what the page could not load. */
function BlindControls({ runId }: { runId: string }) {
  const { labId, timeZone } = useLab();
  const { local, tap } = useIntervention({ labId, runId });
  return <ControlBar view={{ state: 'running', intervention: null }} local={local} onTap={tap} timeZone={timeZone} />;
}

/** The live part, with its acts always at the bottom. */
function LiveScreen({ view, live }: { view: RunView; live: LiveRun }) {
  const { labId, timeZone } = useLab();
  const wide = useWide();
  const now = useNow(500);
  const { state } = live;
  const serverNowMs = now + serverOffsetMs(state);
  const age = linkAge({ nowMs: now, heardAtMs: state.heardAtMs, beat: state.beat, hasController: !view.rehearsal });
  const lost = age.grade === 'lost';
  const { local, tap } = useIntervention({ labId, runId: view.id });
  const strip = useRunStrip(view.id, state, timeZone);
  useAskAgain(view.state === 'held' || view.waiting?.kind === 'prompt', live.refresh);
  const plan = <PlanPanel view={view} rows={state.rows} beat={state.beat} lost={lost} large={wide} />;
  // One that waits is to be seen, and to be withdrawn, without scrolling.
  const afterDwell = <AfterDwell view={view} timeZone={timeZone} serverNowMs={serverNowMs} onTap={() => tap('hold-after-dwell')} />;
  const finish = <FinishEarly view={view} timeZone={timeZone} />;
  const isFinishing = view.finishing !== null && view.finishing.withdrawnBy === null;
  const around = view.rehearsal ? null : (
    <>
      <Surroundings view={view} serverNowMs={serverNowMs} />
      <RunCameras rigId={view.rigId} />
    </>
  );
  const log = <RecentSteps runId={view.id} protocol={view.protocol} rows={state.rows} timeZone={timeZone} count={wide ? 7 : 4} />;
  return (
    <Screen
      title={view.rigName}
      back={back}
      trailing={<LinkChip age={age} />}
      footer={<ControlBar view={view} local={local} onTap={tap} timeZone={timeZone} />}
      asideOnlyWide
      aside={
        <>
          {plan}
          {around}
          {log}
        </>
      }
      testID="run-screen"
    >
      <RunHead view={view} timeZone={timeZone} serverNowMs={serverNowMs} lost={lost} />
      <LockedNotice words={state.beat?.lockedBy ?? null} />
      <LostNotice age={age} notDriven={state.beat?.notDriven} />
      <SlipNotice view={view} timeZone={timeZone} />
      <HeldNotice view={view} timeZone={timeZone} serverNowMs={serverNowMs} />
      <WaitingPanel view={view} timeZone={timeZone} serverNowMs={serverNowMs} />
      {view.holdAfterDwell ? afterDwell : null}
      {isFinishing ? finish : null}
      <LiveStrip strip={strip} timeZone={timeZone} serverNowMs={serverNowMs} title={`${view.rigName}, ${view.protocolName}`} lost={lost} />
      <ReachedPanel view={view} />
      {view.holdAfterDwell ? null : afterDwell}
      {isFinishing ? null : finish}
      {wide ? null : plan}
      {wide ? null : around}
      {wide ? null : log}
      <Facts view={view} />
    </Screen>
  );
}

/** What somebody does at the rig (arming it, closing the door) is no event of the run: whoever waits for it asks now and then. */
function useAskAgain(waits: boolean, ask: () => void): void {
  const latest = useRef(ask);
  useEffect(() => {
    latest.current = ask;
  });
  useEffect(() => {
    if (!waits) return undefined;
    const timer = setInterval(() => latest.current(), askAgainMs);
    return () => clearInterval(timer);
  }, [waits]);
}

/** A wrong count stands above all else, with what is known of it. */
function SlipNotice({ view, timeZone }: { view: RunView; timeZone: string }) {
  if (view.position === null || view.position.slippedAt === null) return null;
  return (
    <Panel edge="danger" testID="slip-notice">
      <PositionFacts position={view.position} timeZone={timeZone} />
    </Panel>
  );
}

function Facts({ view }: { view: RunView }) {
  return (
    <View className="gap-2">
      <View className="flex-row flex-wrap items-center gap-2">
        <Chip>
          {view.protocolName}, revision {view.protocolRevision}
        </Chip>
        <Chip>{view.massSetLabel}</Chip>
        {view.rehearsal ? <Chip tone="lamp">rehearsal</Chip> : null}
      </View>
      <View className="flex-row flex-wrap items-center justify-between gap-2">
        <Label>Started by {view.operator}</Label>
        <TextLink href={`/runs/${view.id}/data`} label="Deflection data" />
      </View>
    </View>
  );
}
