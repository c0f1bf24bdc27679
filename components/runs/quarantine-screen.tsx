import type { Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { serverNowIso, useLab, useLabMutation, wordsOf } from '@/components/api';
import { LockedNotice } from '@/components/rigs/lock-panel';
import { Body, Button, Icon, Label, Panel, ProblemNotice, Screen, Section, Sheet } from '@/components/ui';
import { stopRun, type LiveMessages, type RunView } from '@/shared/contracts/runs';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { TextLink } from './recent-steps';

type Quarantine = NonNullable<RunView['quarantine']>;

/** What lets the run go on, by why it does not. */
const ways: Record<Quarantine['cause'], string> = {
  'other-version':
    'To carry the run on, start the version of the server that wrote it; after a backup was put back, the version that made the backup.',
  'no-link': 'To carry the run on, set up the link of the rig, then start the server again.',
  broken: 'To carry the run on, put right what is said above, then start the server again: it tries once more.',
};

interface QuarantineScreenProps {
  view: RunView;
  quarantine: Quarantine;
  beat: LiveMessages['beat'] | null;
  /** Asks for the run again. */
  refresh: () => void;
}

/** A run that the server found and cannot carry on. Nothing of it is alive, so nothing here looks as if it were. */
export function QuarantineScreen({ view, quarantine, beat, refresh }: QuarantineScreenProps) {
  const { timeZone } = useLab();
  const [ending, setEnding] = useState(false);
  return (
    <Screen title={view.rigName} back={{ href: '/runs' as Href, label: 'Runs' }} testID="quarantine-screen">
      <LockedNotice words={beat?.lockedBy ?? null} />
      <Panel edge="danger" className="gap-3">
        <View role="alert" className="flex-row items-center gap-3">
          <Icon name="warning" size={28} tone="danger" />
          <Body size={20} strong className="min-w-0 shrink">
            This run cannot be carried on. Nobody drives the rig.
          </Body>
        </View>
        <Body testID="quarantine-why">{quarantine.why}</Body>
      </Panel>
      <Section title="What the masses do">
        <Body>
          Nothing moves. Without a server that drives it, the controller brings the turntable to rest within 2 s. Where the masses stand is
          not known here: look at the rig. If anything moves, use the switch at the rig.
        </Body>
      </Section>
      <Section title="What can be done">
        <Body>{ways[quarantine.cause]}</Body>
        {quarantine.cause === 'no-link' ? <TextLink href={`/rigs/${view.rigId}/link`} label="Link of the rig" /> : null}
        <Body>Or end the run. Until then no other run starts on {view.rigName}.</Body>
        <Button kind="danger" size="action" label="End the run" onPress={() => setEnding(true)} className="self-start" testID="end-run" />
      </Section>
      <Section title="What was done until then">
        <Label>
          {view.protocolName}, revision {view.protocolRevision}, by {view.operator};{' '}
          {view.startedAt === null ? 'not started' : `started ${formatDayAndClock(Date.parse(view.startedAt), timeZone)}`};{' '}
          {view.dwellsDone} of {view.dwellsPlanned} dwells done.
        </Label>
        <View className="flex-row flex-wrap gap-x-6">
          <TextLink href={`/runs/${view.id}/log`} label="Step log" />
          <TextLink href={`/runs/${view.id}/data`} label="Deflection data" />
        </View>
      </Section>
      {ending ? <EndSheet view={view} onEnded={refresh} onClose={() => setEnding(false)} /> : null}
    </Screen>
  );
}

function EndSheet({ view, onEnded, onClose }: { view: RunView; onEnded: () => void; onClose: () => void }) {
  const end = useLabMutation(stopRun, () => {
    onClose();
    onEnded();
  });
  return (
    <Sheet
      open
      title="End the run"
      onClose={onClose}
      testID="end-run-sheet"
      footer={
        <Button
          kind="danger"
          size="action"
          label="End the run"
          busy={end.isPending}
          onPress={() => end.mutate({ params: { runId: view.id }, body: { tappedAt: serverNowIso() } })}
          testID="end-run-confirm"
        />
      }
    >
      <Body>
        It ends as failed, with your name in its log, and no version carries it on after that. All that was measured stays. {view.rigName}{' '}
        is free again; the next run homes it first.
      </Body>
      {end.isError ? <ProblemNotice title="The run was not ended" {...wordsOf(end.error)} /> : null}
    </Sheet>
  );
}
