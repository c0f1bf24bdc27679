import { useRouter, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLab, useLabQuery, useMay } from '@/components/api';
import { Body, Button, fileNameOf, Label, Panel, saveTextFile, Section } from '@/components/ui';
import { getRevision, type ProtocolView } from '@/shared/contracts/protocols';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { exportProtocolText } from '@/shared/protocol/json';
import { Miniature } from './miniature';
import { usePlanningRig } from './use-planning-rig';

/** One issued revision: who, when, why, its strip, its text, and the way to start it. */
export function RevisionCard({ protocol, revision }: { protocol: ProtocolView; revision: ProtocolView['revisions'][number] }) {
  const { timeZone } = useLab();
  const router = useRouter();
  const { rig } = usePlanningRig();
  const mayStart = useMay('run.start').ok;
  const document = useLabQuery(getRevision, { params: { protocolId: protocol.id, revision: String(revision.number) } }).data?.data.document;
  return (
    <Section title={`Revision ${revision.number}`}>
      <Panel className="gap-3">
        <View>
          {revision.note === '' ? null : <Body>{revision.note}</Body>}
          <Label>
            issued by {revision.issuedBy}, {formatDayAndClock(Date.parse(revision.issuedAt), timeZone)}
          </Label>
        </View>
        <View className="h-11">{document === undefined || rig === null ? null : <Miniature document={document} rig={rig.document} />}</View>
        <View className="flex-row flex-wrap gap-2">
          <Button
            icon="export"
            label="JSON"
            accessibilityLabel={`Save revision ${revision.number} as JSON`}
            disabled={document === undefined}
            onPress={() =>
              document === undefined
                ? undefined
                : saveTextFile(`${fileNameOf(document.name)}-rev-${revision.number}.protocol.json`, exportProtocolText(document))
            }
          />
          {rig === null || !mayStart ? null : (
            <Button
              icon="start"
              label={`Start on ${rig.name}`}
              onPress={() => router.push(`/rigs/${rig.id}/start?protocol=${protocol.id}&revision=${revision.number}` as Href)}
            />
          )}
        </View>
      </Panel>
    </Section>
  );
}
