import { View } from 'react-native';
import { IconButton, Label, Num } from '@/components/ui';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import type { TimeHand } from './use-time-view';

/** What fingers do on linked plots, by buttons; and the time under the cursor. */
export function TimeControls({ hand, timeZone }: { hand: TimeHand; timeZone: string }) {
  const { cursor, shownAll } = hand;
  return (
    <View className="flex-row items-center justify-between gap-x-2" role="group" aria-label="Shown time">
      <View className="min-w-0 shrink flex-row flex-wrap items-baseline gap-x-2" testID="plot-time">
        {cursor === null ? null : <Num size={17}>{formatClock(cursor, { timeZone, precision: 'seconds' })}</Num>}
        <Label>{`${cursor === null ? 'Times in ' : ''}${zoneName(timeZone)}`}</Label>
      </View>
      <View className="flex-none flex-row">
        <IconButton icon="back" label="Earlier" onPress={() => hand.pan(-1)} disabled={shownAll} testID="plot-earlier" />
        <IconButton icon="forward" label="Later" onPress={() => hand.pan(1)} disabled={shownAll} testID="plot-later" />
        <IconButton icon="minus" label="Show a longer time" onPress={() => hand.zoom(2)} disabled={shownAll} />
        <IconButton icon="plus" label="Show a shorter time" onPress={() => hand.zoom(0.5)} />
        <IconButton icon="repeat" label="Show all" onPress={hand.showAll} disabled={shownAll} />
      </View>
    </View>
  );
}

/** Keys of linked plots; `marks` while a stretch is being marked: then the arrows move the cursor instead of the plot. */
export function keysOf(hand: TimeHand, marks: boolean): Record<string, () => void> {
  const [arrows, shifted] = marks ? [hand.step, hand.pan] : [hand.pan, hand.step];
  return {
    ArrowLeft: () => arrows(-1),
    ArrowRight: () => arrows(1),
    'Shift+ArrowLeft': () => shifted(-1),
    'Shift+ArrowRight': () => shifted(1),
    '+': () => hand.zoom(0.5),
    '=': () => hand.zoom(0.5),
    '-': () => hand.zoom(2),
    Home: hand.showAll,
  };
}
