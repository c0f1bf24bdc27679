import { useLocalSearchParams, type Href } from 'expo-router';
import { View } from 'react-native';
import { wordsOf } from '@/components/api';
import { PlanView } from '@/components/charts/plan-view';
import { ArmPanel } from '@/components/rigs/arm-panel';
import { LockedNotice, lockWords } from '@/components/rigs/lock-panel';
import { useRig } from '@/components/rigs/use-rig';
import { Body, Button, Chip, Empty, Loading, Panel, ProblemNotice, Screen, Tabs, useWide } from '@/components/ui';
import type { RigView } from '@/shared/contracts/rigs';
import { BeforePanel } from './before-panel';
import { DirectionStep } from './direction-step';
import { useFirstMove, type FirstMoveStep } from './first-move-draft';
import { HaltBar } from './halt-bar';
import { LimitsStep } from './limits-step';
import { InputsPanel } from './line-panels';
import { StepsStep } from './steps-step';
import type { StepProps } from './step-props';
import { TravelStep } from './travel-step';
import { useGuided, type GuidedMove } from './use-guided';
import { useLiveLine, type LiveLine } from './use-live-line';

const steps: readonly { value: FirstMoveStep; label: string }[] = [
  { value: 'direction', label: '1 Direction' },
  { value: 'steps', label: '2 Steps' },
  { value: 'travel', label: '3 Travel' },
  { value: 'limits', label: '4 Limits' },
];

/** The guided first move: a person at the rig finds direction, steps per degree and travel, and teaches the controller its limits. */
export function FirstMoveScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const query = useRig(rigId);
  const rig = query.data?.data;
  const back = { href: `/rigs/${rigId}/link` as Href, label: 'the link' };
  if (rig === undefined) {
    return (
      <Screen title="First move" back={back}>
        {query.isError ? (
          <ProblemNotice title="The rig could not be read" {...wordsOf(query.error)} />
        ) : (
          <Loading label="Loading the rig" />
        )}
      </Screen>
    );
  }
  const { motion } = rig.document;
  if (motion === undefined) {
    return (
      <Screen title={`First move of ${rig.name}`} back={back} testID="first-move-screen">
        <Empty title="The rig document has no motion data">
          Import a document with steps per degree and limits as the data sheet of the drive gives them. The first move then measures them.
        </Empty>
      </Screen>
    );
  }
  return <FirstMove rig={rig} motion={motion} etag={query.data?.etag ?? undefined} />;
}

function FirstMove({ rig, motion, etag }: Pick<StepProps, 'rig' | 'motion' | 'etag'>) {
  const live = useLiveLine(rig.id);
  const guided = useGuided(rig.id, live);
  const move = useFirstMove();
  const { line } = live;
  const on = line !== null && guided.mine !== null;
  return (
    <Screen
      title={`First move of ${rig.name}`}
      back={{ href: `/rigs/${rig.id}/link` as Href, label: 'the link' }}
      testID="first-move-screen"
      trailing={<LiveChip live={live} />}
      footer={<HaltBar rigId={rig.id} line={line} />}
      aside={
        <>
          <Where rig={rig} live={live} />
          <InputsPanel line={line} />
        </>
      }
    >
      <LockedNotice words={lockWords(line?.locks ?? [])} />
      {on ? <Steps {...{ rig, motion, etag, line, guided, move }} /> : <BeforePanel rig={rig} line={line} guided={guided} />}
    </Screen>
  );
}

function LiveChip({ live: { line, broken } }: { live: LiveLine }) {
  const ready = !broken && line?.health.condition === 'ready';
  return (
    <Chip dot={ready ? 'good' : 'danger'} tone={ready ? 'dim' : 'danger'} testID="line-chip">
      {broken ? 'server lost' : line === null ? 'listening' : ready ? 'live' : line.health.condition}
    </Chip>
  );
}

function Where({ rig, live: { line, broken } }: { rig: RigView; live: LiveLine }) {
  const wide = useWide();
  return (
    <Panel className="items-center">
      <PlanView rig={rig.document} angleDeg={line?.controller?.angleDeg ?? null} sizePx={wide ? 230 : 150} old={broken} />
    </Panel>
  );
}

function Steps(props: StepProps) {
  const { rig, line, guided, move } = props;
  const { step, direction } = move.draft;
  return (
    <>
      <Tabs
        label="Step of the first move"
        value={step}
        options={steps}
        onChange={(value) => move.set({ step: value })}
        testID="first-move-steps"
      />
      {line.arm === null ? <ArmPanel rig={rig} /> : null}
      {step !== 'direction' && direction !== 'right' ? (
        <Panel edge="lamp" testID="direction-first">
          <Body>The direction comes first: until somebody has seen that the table turns the right way round, this step is not begun.</Body>
        </Panel>
      ) : (
        <Step {...props} />
      )}
      <EndButton guided={guided} />
    </>
  );
}

function Step(props: StepProps) {
  switch (props.move.draft.step) {
    case 'direction':
      return <DirectionStep {...props} />;
    case 'steps':
      return <StepsStep {...props} />;
    case 'travel':
      return <TravelStep {...props} />;
    case 'limits':
      return <LimitsStep {...props} />;
  }
}

function EndButton({ guided }: { guided: GuidedMove }) {
  return (
    <View className="items-start">
      <Button kind="quiet" label="End the first move" busy={guided.busy} onPress={guided.end} testID="end-guided" />
    </View>
  );
}
