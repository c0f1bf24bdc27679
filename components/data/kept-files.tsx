import { View } from 'react-native';
import { addressOf, useLab, useLabQuery } from '@/components/api';
import { DownloadLink } from '@/components/runs/download-link';
import { Body, Label, Panel, Row, Section } from '@/components/ui';
import type { ChannelView } from '@/shared/contracts/data';
import { getImportOriginal, listImports } from '@/shared/contracts/import-files';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { sizeWords } from './upload-panel';

/** The files that the samples of a run came from, as they were sent. */
export function KeptFiles({ runId, channels }: { runId: string; channels: readonly ChannelView[] }) {
  const { labId, timeZone } = useLab();
  const files = useLabQuery(listImports, { params: { runId } });
  const stored = (files.data?.data.items ?? []).filter(({ state }) => state === 'stored');
  if (stored.length === 0) return null;
  return (
    <Section
      title="Files brought in"
      remark="Kept byte for byte as they were sent, and compared with their SHA-256 whenever they are read."
    >
      <Panel testID="kept-files">
        {stored.map((file, index) => (
          <Row key={file.id} last={index === stored.length - 1} className="flex-wrap">
            <View className="min-w-[180px] flex-1">
              <Body strong numberOfLines={1}>
                {file.fileName}
              </Body>
              <Label>
                {sizeWords(file.bytes)} into {channels.find(({ id }) => id === file.channelId)?.name ?? 'a channel'}, by {file.createdBy},{' '}
                {formatDayAndClock(Date.parse(file.storedAt ?? file.createdAt), timeZone)}
              </Label>
              <Label selectable className="break-all" testID="file-sha256">
                SHA-256 {file.sha256}
              </Label>
            </View>
            <DownloadLink
              label="Original"
              address={addressOf(getImportOriginal, { params: { labId, importId: file.id } })}
              fileName={file.fileName}
              testID="original"
            />
          </Row>
        ))}
      </Panel>
    </Section>
  );
}
