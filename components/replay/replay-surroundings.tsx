import { useMemo, useState } from 'react';
import { View } from 'react-native';
import { useLabQuery } from '@/components/api';
import { valueAt } from '@/components/charts/curve';
import { drawnGapMs } from '@/components/data/channel-gap';
import { ChannelLine } from '@/components/data/channel-line';
import { Button } from '@/components/ui';
import { readSamples, type ChannelView } from '@/shared/contracts/data';
import { rangeOf, readingsWithin } from '@/shared/lib/reading-range';

const points = 800;
const nothing = { utcMs: [], value: [] };
/** So many channels stand under the strip until all are asked for. */
const usuallyShown = 4;

interface ReplaySurroundingsProps {
  runId: string;
  channels: readonly ChannelView[];
  fromUtcMs: number;
  toUtcMs: number;
  atUtcMs: number;
}

/** What the room did, under the strip and on its time, with what each channel read at the moment. */
export function ReplaySurroundings({ channels, ...night }: ReplaySurroundingsProps) {
  const [all, setAll] = useState(false);
  if (channels.length === 0) return null;
  const shown = all ? channels : channels.slice(0, usuallyShown);
  return (
    <View className="gap-2" testID="replay-surroundings">
      {shown.map((channel) => (
        <Surrounding key={channel.id} channel={channel} {...night} />
      ))}
      {shown.length === channels.length ? null : (
        <Button kind="quiet" label={`All ${String(channels.length)} channels`} onPress={() => setAll(true)} className="self-start" />
      )}
    </View>
  );
}

function Surrounding({ runId, channel, atUtcMs, ...time }: Omit<ReplaySurroundingsProps, 'channels'> & { channel: ChannelView }) {
  const samples = useLabQuery(readSamples, { params: { runId }, query: { channelId: channel.id, points } });
  const { utcMs, value } = samples.data?.data ?? nothing;
  const { series, range, print, gapMs } = useMemo(() => {
    const found = rangeOf(value);
    return {
      series: { x: utcMs, y: value },
      range: found,
      print: readingsWithin(channel.unit, found),
      gapMs: drawnGapMs(channel, utcMs, points),
    };
  }, [utcMs, value, channel]);
  const reading = valueAt(series, atUtcMs, gapMs);
  return (
    <ChannelLine
      name={channel.name}
      reading={reading !== null ? print(reading) : samples.isPending ? '' : 'no data'}
      {...{ series, range, gapMs, atUtcMs }}
      {...time}
      testID={`replay-surrounding-${channel.name}`}
    />
  );
}
