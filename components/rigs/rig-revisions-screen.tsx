import { useLocalSearchParams, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Label, Loading, Panel, ProblemNotice, Screen, Section, fileNameOf, saveTextFile } from '@/components/ui';
import { listRigRevisions } from '@/shared/contracts/rigs';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { documentChanges } from './document-rows';
import { ChangeList } from './revise-sheet';
import { useRig } from './use-rig';

type Revision = NonNullable<ReturnType<typeof useRevisions>['data']>['data']['items'][number];
const useRevisions = (rigId: string) => useLabQuery(listRigRevisions, { params: { rigId } });

/** All revisions of a rig, newest first, each with what it changed. */
export function RigRevisionsScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const rig = useRig(rigId).data?.data;
  const revisions = useRevisions(rigId);
  const items = revisions.data?.data.items ?? [];
  return (
    <Screen title={`Revisions of ${rig?.name ?? 'the rig'}`} back={{ href: `/rigs/${rigId}` as Href, label: rig?.name ?? 'the rig' }}>
      {revisions.isPending ? <Loading label="Loading the revisions" /> : null}
      {revisions.isError ? (
        <ProblemNotice
          title="The revisions could not be read"
          {...wordsOf(revisions.error)}
          action={{ label: 'Try again', onPress: () => void revisions.refetch() }}
        />
      ) : null}
      {items.map((revision, index) => (
        <RevisionPanel key={revision.number} revision={revision} before={items[index + 1] ?? null} name={rig?.name ?? 'rig'} />
      ))}
    </Screen>
  );
}

function RevisionPanel({ revision, before, name }: { revision: Revision; before: Revision | null; name: string }) {
  const { timeZone } = useLab();
  const [open, setOpen] = useState(false);
  const changes = before === null ? [] : documentChanges(before.document, revision.document);
  return (
    <Section title={`Revision ${revision.number}`}>
      <Panel className="gap-3">
        <View>
          <Body>{revision.reason}</Body>
          <Label>
            {revision.by}, {formatDayAndClock(Date.parse(revision.at), timeZone)}
          </Label>
        </View>
        <View className="flex-row flex-wrap gap-2">
          {changes.length === 0 ? null : (
            <Button
              expanded={open}
              icon="compare"
              label={open ? 'Hide the changes' : `${changes.length} ${changes.length === 1 ? 'change' : 'changes'}`}
              onPress={() => setOpen(!open)}
            />
          )}
          <Button
            icon="export"
            label="JSON"
            accessibilityLabel={`Save revision ${revision.number} as JSON`}
            onPress={() =>
              saveTextFile(`${fileNameOf(name)}-rev-${revision.number}.rig.json`, `${JSON.stringify(revision.document, null, 2)}\n`)
            }
          />
        </View>
        {before !== null && changes.length === 0 ? <Label>No quantity differs from revision {before.number}.</Label> : null}
        {open ? <ChangeList changes={changes} /> : null}
      </Panel>
    </Section>
  );
}
