import { useMemo } from 'react';
import { useLabQuery } from '@/components/api';
import { drawnGapMs, silentAfterMs } from '@/components/data/channel-gap';
import { ChannelLine } from '@/components/data/channel-line';
import { Panel, Section } from '@/components/ui';
import { listChannels, readSamples, type ChannelView } from '@/shared/contracts/data';
import type { RunView } from '@/shared/contracts/runs';
import { formatAgo } from '@/shared/lib/format-duration';
import { rangeOf, readingsWithin } from '@/shared/lib/reading-range';

const everyMs = 15_000;
const points = 240;
const nothing = { utcMs: [], value: [] };

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
  const { utcMs, value } = samples.data?.data ?? nothing;
  const { series, range, print } = useMemo(() => {
    const found = rangeOf(value);
    return { series: { x: utcMs, y: value }, range: found, print: readingsWithin(channel.unit, found) };
  }, [utcMs, value, channel.unit]);
  const [first, last, newest] = [utcMs[0], utcMs.at(-1), value.at(-1)];
  const isSilent = last !== undefined && serverNowMs - last > silentAfterMs(channel);
  const silent = isSilent ? `; silent, last sample ${formatAgo((serverNowMs - last) / 1000)}` : '';
  return (
    <ChannelLine
      name={channel.name}
      reading={newest === undefined ? '' : print(newest)}
      series={series}
      range={range}
      fromUtcMs={Math.min(first ?? 0, Date.parse(view.startedAt ?? '') || Infinity)}
      toUtcMs={Math.max(serverNowMs, last ?? 0)}
      gapMs={drawnGapMs(channel, utcMs, points)}
      remark={
        range !== null
          ? `${print(range.least)} to ${print(range.greatest)} in this run${silent}`
          : samples.isPending
            ? 'Loading'
            : 'Nothing in this run yet.'
      }
      testID={`surrounding-${channel.name}`}
    />
  );
}
