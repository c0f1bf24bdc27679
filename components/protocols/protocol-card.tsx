import { Link, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLab, useLabQuery } from '@/components/api';
import { Chip, Heading, Label } from '@/components/ui';
import { getProtocol, type ProtocolSummary } from '@/shared/contracts/protocols';
import { formatDayAndClock } from '@/shared/lib/format-time';
import type { RigDocument } from '@/shared/rig/document';
import { Miniature } from './miniature';

const stateWords = ({ latestRevision, draftDiffers }: ProtocolSummary): string =>
  latestRevision === null ? 'draft' : draftDiffers ? `rev ${latestRevision}, draft differs` : `rev ${latestRevision}`;

/** One protocol in the list; the whole card leads to the editor. */
export function ProtocolCard({ protocol, rig }: { protocol: ProtocolSummary; rig: RigDocument | null }) {
  const { timeZone } = useLab();
  const document = useLabQuery(getProtocol, { params: { protocolId: protocol.id } }).data?.data.document;
  return (
    <Link
      href={`/protocols/${protocol.id}` as Href}
      testID={`protocol-${protocol.id}`}
      className="rounded-panel border border-panel bg-panel p-4 hover:border-line wide:w-[calc(50%-8px)]"
      style={{ display: 'flex', flexDirection: 'column', gap: 12 }}
    >
      <View className="w-full flex-row flex-wrap items-center justify-between gap-2">
        <Heading level={2} className="shrink">
          {protocol.name}
        </Heading>
        <Chip tone={protocol.draftDiffers ? 'lamp' : 'dim'}>{stateWords(protocol)}</Chip>
      </View>
      <View className="h-11 w-full">{document === undefined || rig === null ? null : <Miniature document={document} rig={rig} />}</View>
      <Label>
        {protocol.stepCount} {protocol.stepCount === 1 ? 'step' : 'steps'}, {protocol.updatedBy},{' '}
        {formatDayAndClock(Date.parse(protocol.updatedAt), timeZone)}
      </Label>
    </Link>
  );
}
