import { useLocalSearchParams, useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { isProblem, useLab, useMay, wordsOf } from '@/components/api';
import { CamerasPanel } from '@/components/cameras/cameras-panel';
import { PlanView } from '@/components/charts/plan-view';
import { Body, Button, Chip, Label, Loading, Panel, ProblemNotice, Screen, Section, useWide } from '@/components/ui';
import type { RigView } from '@/shared/contracts/rigs';
import { ArmPanel } from './arm-panel';
import { ChannelCalibrations } from './channel-calibrations';
import { ChannelLimits } from './channel-limits';
import { DevicesPanel } from './devices-panel';
import { linkState } from './link-words';
import { LinkPanel } from './link-panel';
import { LiveFacts } from './live-facts';
import { BlindLock, LockPanel } from './lock-panel';
import { MassSets } from './mass-sets';
import { PositionFacts } from './position-facts';
import { RigDocumentSection } from './rig-document-section';
import { RunningNow } from './running-now';
import { useRig } from './use-rig';

/** One rig: what it is doing, who answers for it, how it is reached, what it is. */
export function RigScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const query = useRig(rigId);
  const rig = query.data?.data;
  if (rig === undefined) {
    return (
      <Screen title="Rig" back={{ href: '/rigs', label: 'rigs' }}>
        {query.isError ? (
          <>
            <ProblemNotice
              title="The rig could not be read"
              {...wordsOf(query.error)}
              action={{ label: 'Try again', onPress: () => void query.refetch() }}
            />
            {isProblem(query.error, 'not-found') ? null : <BlindLock rigId={rigId} />}
          </>
        ) : (
          <Loading label="Loading the rig" />
        )}
      </Screen>
    );
  }
  const link = linkState(rig.live);
  return (
    <Screen
      title={rig.name}
      back={{ href: '/rigs', label: 'rigs' }}
      testID="rig-screen"
      trailing={
        <Chip dot={link.tone} tone={link.tone === 'danger' ? 'danger' : 'dim'} testID="rig-link-state">
          {link.words}
        </Chip>
      }
      footer={<StartButton rig={rig} />}
      footerGivesWay
      aside={
        <>
          <RigDocumentSection rig={rig} etag={query.data?.etag ?? undefined} />
          <MassSets rig={rig} />
          <ChannelLimits rigId={rig.id} />
          <ChannelCalibrations rigId={rig.id} />
        </>
      }
    >
      <RunningNow rig={rig} />
      <LivePanel rig={rig} />
      <PositionPanel rig={rig} />
      <ArmPanel rig={rig} />
      <LockPanel rig={rig} readAtMs={query.dataUpdatedAt} />
      <LinkPanel rig={rig} />
      <CamerasPanel rig={rig} />
      <DevicesPanel rig={rig} />
    </Screen>
  );
}

function LivePanel({ rig }: { rig: RigView }) {
  const wide = useWide();
  return (
    <Panel className="gap-4">
      <View className="flex-row flex-wrap items-center gap-5">
        <PlanView rig={rig.document} angleDeg={rig.live.angleDeg} sizePx={wide ? 230 : 136} old={rig.live.condition !== 'ready'} />
        <LiveFacts live={rig.live} />
      </View>
      <Label>{rig.live.detail}</Label>
    </Panel>
  );
}

/** Without an encoder the home edge is what a counted angle is held against. */
function PositionPanel({ rig }: { rig: RigView }) {
  const { timeZone } = useLab();
  return (
    <Section title="Position">
      <Panel edge={rig.position?.slippedAt == null ? undefined : 'danger'}>
        <PositionFacts position={rig.position} timeZone={timeZone} />
      </Panel>
    </Section>
  );
}

function StartButton({ rig }: { rig: RigView }) {
  const router = useRouter();
  const mayStart = useMay('run.start');
  const [hint, setHint] = useState(false);
  if (!mayStart.ok) return <Body tone="dim">{mayStart.why}</Body>;
  const busy = rig.activeRun !== null;
  return (
    <View className="gap-2">
      {hint && busy ? (
        <Body role="status">
          {rig.name} is running {rig.activeRun?.protocolName}. One run at a time: wait until it ends, or stop it.
        </Body>
      ) : null}
      <Button
        kind={busy ? 'plain' : 'primary'}
        size="action"
        icon="start"
        label="Start a run"
        testID="start-a-run"
        onPress={() => (busy ? setHint(true) : router.push(`/rigs/${rig.id}/start` as Href))}
      />
    </View>
  );
}
