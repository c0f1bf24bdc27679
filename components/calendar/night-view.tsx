import { Pressable, View } from 'react-native';
import { Body, Label, Num } from '@/components/ui';
import type { CalendarItem } from '@/shared/contracts/schedules';
import { formatClock } from '@/shared/lib/format-time';
import { stateMarks } from './calendar-words';
import { barsOf, type Bar, type Night } from './nights';

const ticks = ['12', '18', '00', '06', '12'];

interface NightRowProps {
  label: string;
  night: Night;
  items: readonly CalendarItem[];
  /** Where the present instant lies, UTC ms. */
  nowUtcMs: number;
  timeZone: string;
  onOpen: (item: CalendarItem) => void;
}

/** Hours over the nights below. */
export function NightHours() {
  return (
    <View className="flex-row pl-[92px]" aria-hidden>
      <View className="flex-1 flex-row justify-between">
        {ticks.map((tick, index) => (
          <Num key={index} size={13} tone="dim">
            {tick}
          </Num>
        ))}
      </View>
    </View>
  );
}

/** One night from noon to noon with a bar for each run; lines every 6 h. */
export function NightRow({ label, night, items, nowUtcMs, timeZone, onOpen }: NightRowProps) {
  const now = (nowUtcMs - night.fromUtcMs) / (night.untilUtcMs - night.fromUtcMs);
  const here = now >= 0 && now < 1;
  return (
    <View className="min-h-target flex-row items-stretch gap-3" testID="night-row">
      <View className="w-20 flex-none justify-center">
        <Body size={13} strong={here} tone={here ? 'text' : 'dim'}>
          {label}
        </Body>
      </View>
      <View className="relative min-w-0 flex-1 overflow-hidden rounded-lg bg-panel">
        {[0.25, 0.5, 0.75].map((at) => (
          <View key={at} aria-hidden className="absolute bottom-0 top-0 w-px bg-line" style={{ left: `${at * 100}%` }} />
        ))}
        {barsOf(items, night).map((bar) => (
          <NightBar key={`${bar.item.scheduleId} ${bar.item.dueAt}`} bar={bar} timeZone={timeZone} onOpen={onOpen} />
        ))}
        {here ? <View aria-hidden className="absolute bottom-0 top-0 w-0.5 bg-text" style={{ left: `${now * 100}%` }} /> : null}
      </View>
    </View>
  );
}

function NightBar({ bar: { item, left, width }, timeZone, onOpen }: { bar: Bar; timeZone: string; onOpen: (item: CalendarItem) => void }) {
  const mark = stateMarks[item.state];
  const clock = (iso: string) => formatClock(Date.parse(iso), { timeZone });
  return (
    <Pressable
      role="button"
      aria-label={`${item.rigName}, ${item.protocolName}, ${clock(item.dueAt)} to ${clock(item.endsAt)}: ${mark.word}`}
      onPress={() => onOpen(item)}
      className="absolute bottom-0 top-0 min-w-target justify-center"
      style={{ left: `${left * 100}%`, width: `${width * 100}%` }}
    >
      <View className={`h-7 rounded-md border-2 ${mark.bar}`} />
    </Pressable>
  );
}

/** The same as words, for those who read lists. */
export function StartRow({
  item,
  timeZone,
  onOpen,
  last,
}: {
  item: CalendarItem;
  timeZone: string;
  onOpen: (item: CalendarItem) => void;
  last: boolean;
}) {
  const mark = stateMarks[item.state];
  const clock = (iso: string) => formatClock(Date.parse(iso), { timeZone });
  return (
    <Pressable
      role="button"
      testID="start-row"
      onPress={() => onOpen(item)}
      className={`min-h-target flex-row items-center gap-3 py-3 hover:bg-panel ${last ? '' : 'border-b border-line'}`}
    >
      <View className="w-[108px] flex-none">
        <Num size={15} className="whitespace-nowrap">
          {clock(item.dueAt)}–{clock(item.endsAt)}
        </Num>
      </View>
      <View className="min-w-0 flex-1">
        <Body strong numberOfLines={1}>
          {item.protocolName}
        </Body>
        <Label numberOfLines={1}>{item.rigName}</Label>
        {item.why === '' ? null : <Label>{item.why}</Label>}
        {item.remark === null ? null : <Label>{item.remark}</Label>}
      </View>
      <Body size={13} tone={mark.tone}>
        {mark.word}
      </Body>
    </Pressable>
  );
}
