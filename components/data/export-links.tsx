import { View } from 'react-native';
import { addressOf, useLab } from '@/components/api';
import { DownloadLink } from '@/components/runs/download-link';
import { Label } from '@/components/ui';
import { exportSamplesCsv, exportSamplesNdjson, type ChannelView } from '@/shared/contracts/data';
import { unitSign } from '@/shared/lib/format-number';

export interface Span {
  fromUtcMs: number;
  toUtcMs: number;
}

/** Every sample of what is shown as a file: of the stretch that was zoomed to, else of the whole run. */
export function ExportLinks({ channel, whole, shown }: { channel: ChannelView; whole: Span; shown: Span | null }) {
  const { labId } = useLab();
  const { fromUtcMs, toUtcMs } = shown ?? whole;
  const asked = {
    params: { labId, channelId: channel.id },
    query: { fromUtcMs: Math.floor(fromUtcMs), toUtcMs: Math.ceil(toUtcMs) },
  };
  return (
    <View className="gap-1" testID="export">
      <View className="flex-row flex-wrap gap-3">
        <DownloadLink
          framed
          label="Export CSV"
          address={addressOf(exportSamplesCsv, asked)}
          fileName={`${channel.name}.csv`}
          testID="export-csv"
        />
        <DownloadLink
          framed
          label="Export JSON lines"
          address={addressOf(exportSamplesNdjson, asked)}
          fileName={`${channel.name}.ndjson`}
          testID="export-ndjson"
        />
      </View>
      <Label>
        {shown === null ? 'Every sample of the run' : 'Every sample of the stretch shown'}, none left out: times in UTC to the microsecond,
        values in {unitSign(channel.unit)} that read back to the same number.
      </Label>
    </View>
  );
}
