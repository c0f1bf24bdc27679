import { View } from 'react-native';
import { useLabQuery } from '@/components/api';
import { SparkLine } from '@/components/charts';
import { Body, Label, Num, Panel, Section } from '@/components/ui';
import { listChannels, readSamples, type ChannelView } from '@/shared/contracts/data';
import type { RunView } from '@/shared/contracts/runs';
import { formatReading } from '@/shared/lib/format-angle';
import { formatFixed, withUnit } from '@/shared/lib/format-number';
import { formatAgo } from '@/shared/lib/format-duration';

const everyMs = 15_000;
const points = 240;
/** Beyond so many of its own intervals, and a minute, a channel is said to be silent. */
const silentIntervals = 3;
const silentMs = 60_000;

/** Temperature, tilt, pressure and whatever else the rig has channels for, as they are now and were since the run began. */
export function Surroundings({ view, serverNowMs }: { view: RunView; serverNowMs: number }) {
  const channels = useLabQuery(listChannels, { params: { rigId: view.rigId } });
  const around = (channels.data?.data.items ?? []).filter(({ role }) => role === 'environment');
  if (around.length === 0) return null;
  return (
    <Section title="Surroundings">
      <Panel className="gap-4" testID="surroundings">
        {around.map((channel) => (
          <Surrounding key={channel.id} channel={channel} view={view} serverNowMs={serverNowMs} />
        ))}
      </Panel>
    </Section>
  );
}

function Surrounding({ channel, view, serverNowMs }: { channel: ChannelView; view: RunView; serverNowMs: number }) {
  const asked = { params: { runId: view.id }, query: { channelId: channel.id, points } };
  const samples = useLabQuery(readSamples, { ...asked, everyMs });
  const { utcMs, value } = samples.data?.data ?? { utcMs: [], value: [] };
  const [first, last, newest] = [utcMs[0], utcMs.at(-1), value.at(-1)];
  const reading = readingIn(channel.unit, value);
  const gapMs = Math.max(silentMs, channel.rateHz === null ? 0 : (1000 * silentIntervals) / channel.rateHz);
  return (
    <View className="gap-1" testID={`surrounding-${channel.name}`}>
      <View className="flex-row flex-wrap items-baseline justify-between gap-x-3">
        <Body className="min-w-0 shrink">{channel.name}</Body>
        {newest === undefined ? null : <Num strong>{reading(newest)}</Num>}
      </View>
      {first === undefined || last === undefined ? (
        <Label>{samples.isPending ? 'Loading' : 'Nothing in this run yet.'}</Label>
      ) : (
        <>
          <SparkLine
            series={{ x: utcMs, y: value }}
            fromUtcMs={Math.min(first, Date.parse(view.startedAt ?? '') || first)}
            toUtcMs={Math.max(serverNowMs, last)}
            // What is drawn may be thinned to the least and greatest of intervals.
            gapMs={Math.max(gapMs, (4 * (last - first)) / points)}
          />
          <Label>
            {reading(Math.min(...value))} to {reading(Math.max(...value))} in this run
            {serverNowMs - last > gapMs ? `; silent, last sample ${formatAgo((serverNowMs - last) / 1000)}` : ''}
          </Label>
        </>
      )}
    </View>
  );
}

/** Readings of a channel with as many decimals as tell its least from its greatest. */
function readingIn(unit: string, value: readonly number[]): (reading: number) => string {
  const span = Math.max(...value) - Math.min(...value);
  if (!(span > 0)) return (reading) => formatReading(reading, unit);
  const decimals = Math.min(6, Math.max(0, 1 - Math.floor(Math.log10(span))));
  return (reading) => withUnit(formatFixed(reading, { decimals }), unit);
}
