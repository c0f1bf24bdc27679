import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Button, Icon, Label, Panel, Row, Section } from '@/components/ui';
import type { ImportView } from '@/shared/contracts/import-files';
import { formatFixed, NARROW_SPACE } from '@/shared/lib/format-number';
import { formatDayAndClock } from '@/shared/lib/format-time';
import type { UploadProgress } from './upload';

const mib = (bytes: number) => formatFixed(bytes / 1_048_576, { decimals: bytes < 10_485_760 ? 1 : 0 });

/** How large a file is, KiB or MiB. */
export const sizeWords = (bytes: number): string =>
  bytes < 1_048_576
    ? `${formatFixed(bytes / 1024, { decimals: bytes < 102_400 ? 1 : 0 })}${NARROW_SPACE}KiB`
    : `${mib(bytes)}${NARROW_SPACE}MiB`;

const partWords = (sent: number, bytes: number) =>
  bytes < 1_048_576 ? `some of ${sizeWords(bytes)}` : `${mib(sent)} of ${mib(bytes)}${NARROW_SPACE}MiB`;

/** A file on its way: how much has come, why it waits, and a way to break it off. */
export function UploadPanel({ fileName, bytes, sent, waiting, onCancel }: UploadProgress & { fileName: string; onCancel: () => void }) {
  const share = bytes === 0 ? 1 : sent / bytes;
  const percent = Math.floor(100 * share);
  return (
    <Panel edge={waiting === null ? undefined : 'lamp'} className="gap-3" testID="upload">
      <View className="flex-row items-center gap-3">
        <Icon name="import" tone="dim" />
        <View className="min-w-0 flex-1">
          <Body strong numberOfLines={1}>
            {fileName}
          </Body>
          <Label testID="upload-sent">
            {share < 1 ? `${partWords(sent, bytes)} have come` : `All ${sizeWords(bytes)} have come; the file is being put away`}
          </Label>
        </View>
        <Button kind="quiet" label="Cancel" accessibilityLabel={`Cancel sending ${fileName}`} onPress={onCancel} testID="cancel-upload" />
      </View>
      <div
        role="progressbar"
        aria-label={`Sending ${fileName}`}
        aria-valuemin={0}
        aria-valuemax={100}
        aria-valuenow={percent}
        className="h-2 overflow-hidden rounded-full bg-panel2"
      >
        <div className="h-full rounded-full bg-lamp" style={{ width: `${String(percent)}%` }} />
      </div>
      <View role="status" aria-live="polite">
        {waiting === null ? null : (
          <Body testID="upload-waiting">{waiting} What has come is kept; it goes on by itself. Leave this page open.</Body>
        )}
      </View>
    </Panel>
  );
}

/** Files that came in part: what goes on with them. */
export function UnfinishedFiles({ files, onThrowAway }: { files: readonly ImportView[]; onThrowAway: (importId: string) => void }) {
  const { timeZone } = useLab();
  if (files.length === 0) return null;
  return (
    <Section
      title="Not whole yet"
      remark="Choose the same file again, and only what is missing is sent. What nobody goes on with is removed after 7 days."
    >
      <Panel testID="unfinished">
        {files.map(({ id, fileName, bytes, wantedBytes, createdAt, createdBy }, index) => (
          <Row key={id} last={index === files.length - 1}>
            <View className="min-w-0 flex-1">
              <Body strong numberOfLines={1}>
                {fileName}
              </Body>
              <Label>
                {partWords(bytes, wantedBytes ?? bytes)}, begun by {createdBy}, {formatDayAndClock(Date.parse(createdAt), timeZone)}
              </Label>
            </View>
            <Button
              kind="quiet"
              label="Throw away"
              accessibilityLabel={`Throw ${fileName} away`}
              onPress={() => onThrowAway(id)}
              testID="throw-away"
            />
          </Row>
        ))}
      </Panel>
    </Section>
  );
}
