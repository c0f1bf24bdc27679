import { useLocalSearchParams, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Empty, Field, Loading, Panel, ProblemNotice, Screen, Section, Select } from '@/components/ui';
import { getProtocol, listProtocols, type ProtocolSummary } from '@/shared/contracts/protocols';
import type { RigView } from '@/shared/contracts/rigs';
import { LockedNotice, lockWords } from './lock-panel';
import { StartCheckSection } from './start-check-section';
import { StartReview } from './start-review';
import { useRig } from './use-rig';

/** Where a run is chosen, checked, reviewed and started. Addressed by rig; protocol and revision may come along. */
export function StartScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const query = useRig(rigId);
  const protocols = useLabQuery(listProtocols);
  const mayStart = useMay('run.start');
  const rig = query.data?.data;
  const issued = protocols.data?.data.items.filter((protocol) => protocol.latestRevision !== null);
  const failure = query.error ?? protocols.error;
  const back = { href: `/rigs/${rigId}` as Href, label: rig?.name ?? 'the rig' };
  const title = rig === undefined ? 'Start a run' : `Start on ${rig.name}`;
  if (rig === undefined || issued === undefined || !mayStart.ok || issued.length === 0) {
    return (
      <Screen title={title} back={back}>
        {!mayStart.ok ? (
          <Body tone="dim">{mayStart.why}</Body>
        ) : failure !== null ? (
          <ProblemNotice title="This could not be read" {...wordsOf(failure)} />
        ) : issued?.length === 0 ? (
          <NothingIssued />
        ) : (
          <Loading label="Loading rig and protocols" />
        )}
      </Screen>
    );
  }
  return <StartForm rig={rig} issued={issued} title={title} back={back} />;
}

function NothingIssued() {
  return (
    <Empty title="No issued protocol" icon="protocols">
      A run carries out an issued revision. Write a protocol under Protocols and issue it.
    </Empty>
  );
}

interface StartFormProps {
  rig: RigView;
  issued: readonly ProtocolSummary[];
  title: string;
  back: { href: Href; label: string };
}

/** What is to be run, with which masses; the review stands beside it when wide, below it on a phone. */
function StartForm({ rig, issued, title, back }: StartFormProps) {
  const wanted = useLocalSearchParams<{ protocol?: string; revision?: string }>();
  const [protocolId, setProtocolId] = useState(issued.find(({ id }) => id === wanted.protocol)?.id ?? issued[0]?.id ?? '');
  const [chosenRevision, setChosenRevision] = useState(wanted.revision ?? '');
  const [massSetId, setMassSetId] = useState(rig.massSets[0]?.id ?? '');
  const [notes, setNotes] = useState('');
  const protocol = issued.find(({ id }) => id === protocolId);
  const revisions = useLabQuery(getProtocol, { params: { protocolId } }).data?.data.revisions ?? [];
  const revision = revisions.find(({ number }) => String(number) === chosenRevision)?.number ?? protocol?.latestRevision ?? 1;
  const options =
    revisions.length === 0
      ? [{ value: String(revision), label: `Revision ${revision}` }]
      : revisions.map(({ number, note }) => ({ value: String(number), label: `Revision ${number}${note === '' ? '' : `: ${note}`}` }));
  const choice = { protocolId, protocolName: protocol?.name ?? '', revision, massSetId, notes };
  const choose = (id: string) => {
    setProtocolId(id);
    setChosenRevision('');
  };
  return (
    <Screen title={title} back={back} testID="start-screen" aside={<StartReview rig={rig} choice={choice} />}>
      <LockedNotice words={lockWords(rig.locks)} />
      <Section title="What to run">
        <Panel className="gap-4">
          <View className="gap-4 wide:flex-row wide:*:flex-1">
            <Select
              label="Protocol"
              value={protocolId}
              options={issued.map(({ id, name }) => ({ value: id, label: name }))}
              onChange={choose}
              testID="start-protocol"
            />
            <Select label="Revision" value={String(revision)} options={options} onChange={setChosenRevision} testID="start-revision" />
          </View>
          <Select
            label="Mass set on the turntable"
            value={massSetId}
            options={rig.massSets.map(({ id, label }) => ({ value: id, label }))}
            onChange={setMassSetId}
            hint="What really sits there now; one run has one mass set."
            testID="start-mass-set"
            error={rig.massSets.length === 0 ? 'the rig has no mass set yet; a keeper adds one on the rig page' : undefined}
          />
          <Field label="Notes for the log" value={notes} onChange={setNotes} lines={2} />
        </Panel>
      </Section>
      <StartCheckSection rig={rig} choice={choice} />
    </Screen>
  );
}
