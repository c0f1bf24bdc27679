import { useLocalSearchParams, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { useLabQuery, wordsOf } from '@/components/api';
import { Empty, Label, Loading, Panel, ProblemNotice, Screen, Section, Select } from '@/components/ui';
import { getProtocol, getRevision, type ProtocolView } from '@/shared/contracts/protocols';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { DifferencesList } from './differences-list';
import { RevisionCard } from './revision-card';

/** The issued revisions of a protocol, and any two of them or the draft compared. */
export function ProtocolRevisionsScreen() {
  const { protocolId } = useLocalSearchParams<{ protocolId: string }>();
  const query = useLabQuery(getProtocol, { params: { protocolId } });
  const protocol = query.data?.data;
  const back = { href: `/protocols/${protocolId}` as Href, label: protocol?.name ?? 'the protocol' };
  if (protocol === undefined) {
    return (
      <Screen title="Revisions" back={back}>
        {query.isError ? (
          <ProblemNotice title="The protocol could not be read" {...wordsOf(query.error)} />
        ) : (
          <Loading label="Loading the revisions" />
        )}
      </Screen>
    );
  }
  return (
    <Screen
      title={`Revisions of ${protocol.name}`}
      back={back}
      testID="protocol-revisions"
      aside={protocol.revisions.length === 0 ? undefined : hasTwo(protocol) ? <Comparison protocol={protocol} /> : <OnlyOne />}
    >
      {protocol.revisions.length === 0 ? (
        <Empty title="Nothing issued yet" icon="document">
          Issuing the draft makes revision 1, which never changes and can be run.
        </Empty>
      ) : null}
      {protocol.revisions.map((revision) => (
        <RevisionCard key={revision.number} protocol={protocol} revision={revision} />
      ))}
    </Screen>
  );
}

/** Two revisions, or one and a draft that says something else. */
const hasTwo = ({ revisions, draftDiffers }: ProtocolView): boolean => revisions.length > 1 || draftDiffers;

function OnlyOne() {
  return (
    <Section title="Compare two">
      <Panel testID="only-one-revision">
        <Label>There is one revision only, and the draft is the same. Change the draft or issue another revision to compare.</Label>
      </Panel>
    </Section>
  );
}

const draft = 'draft';

function useSide(protocol: ProtocolView, side: string): ProtocolDocument | null {
  const revision = useLabQuery(getRevision, { params: { protocolId: protocol.id, revision: side }, enabled: side !== draft });
  return side === draft ? protocol.document : (revision.data?.data.document ?? null);
}

function Comparison({ protocol }: { protocol: ProtocolView }) {
  const options = [
    { value: draft, label: 'Draft' },
    ...protocol.revisions.map(({ number }) => ({ value: String(number), label: `Revision ${number}` })),
  ];
  const [from, setFrom] = useState(String(protocol.revisions[protocol.draftDiffers ? 0 : 1]?.number ?? draft));
  const [to, setTo] = useState(protocol.draftDiffers ? draft : String(protocol.revisions[0]?.number ?? draft));
  const before = useSide(protocol, from);
  const after = useSide(protocol, to);
  return (
    <Section title="Compare two">
      <View className="flex-row gap-3">
        <View className="flex-1">
          <Select label="From" value={from} options={options} onChange={setFrom} testID="compare-from" />
        </View>
        <View className="flex-1">
          <Select label="To" value={to} options={options} onChange={setTo} testID="compare-to" />
        </View>
      </View>
      <Panel className="py-2">
        {from === to ? (
          <Label testID="one-with-itself">Both sides are the same one: choose another on one side.</Label>
        ) : before === null || after === null ? (
          <Loading label="Reading both" />
        ) : (
          <DifferencesList before={before} after={after} />
        )}
      </Panel>
    </Section>
  );
}
