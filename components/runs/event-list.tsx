import { View } from 'react-native';
import { Body, Label, Num } from '@/components/ui';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { formatClock } from '@/shared/lib/format-time';
import { eventFacts } from './event-facts';
import { eventWords } from './run-words';

/** Events of the chain in order, each with its number and the beginning of its hash. */
export function EventList({ events, timeZone }: { events: readonly ChainedEvent[]; timeZone: string }) {
  if (events.length === 0) return <Label>No events in this step.</Label>;
  return (
    <View className="gap-2" role="list">
      {events.map((event) => (
        <View key={event.seq} role="listitem" className="flex-row flex-wrap items-baseline gap-x-3">
          <Num size={13} tone="dim">
            {event.seq}
          </Num>
          <Num size={13}>{formatClock(Date.parse(event.at), { timeZone, precision: 'ms' })}</Num>
          <Body size={15}>{eventWords(event.kind)}</Body>
          <Label className="min-w-0 shrink">{eventFacts(event.data)}</Label>
          <Num size={13} tone="dim" aria-label={`hash begins with ${event.hash.slice(0, 8)}`}>
            {event.hash.slice(0, 8)}
          </Num>
        </View>
      ))}
    </View>
  );
}

/** The head of the chain: whoever keeps it can prove later that nothing before it was changed. */
export function ChainHead({ events }: { events: readonly ChainedEvent[] }) {
  const head = events.at(-1);
  if (!head) return null;
  return (
    <View className="gap-1" testID="chain-head">
      <Label>
        {events.length} events. Head of the chain, number {head.seq}:
      </Label>
      <Num size={13} selectable style={{ wordBreak: 'break-all' } as object}>
        {head.hash}
      </Num>
      <Label>Each event holds the hash of the one before it; a changed or missing one shows.</Label>
    </View>
  );
}
