import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useMay } from '@/components/api';
import { markedSpan, nothingMarked, withEnd, type Marking } from '@/components/charts/marking';
import type { Painter, TimeSpan } from '@/components/charts/time-plot-types';
import { Body, Button, Label } from '@/components/ui';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import { stretchWords } from './stretch';

/** A stretch in the making: null while the plot is only looked at. */
export function useMarking() {
  const [marking, setMarking] = useState<Marking | null>(null);
  const setEnd = (utcMs: number) => setMarking((before) => withEnd(before ?? nothingMarked, utcMs));
  const painter: Painter | undefined = marking === null ? undefined : { onDrag: (one, other) => setMarking({ one, other }), onTap: setEnd };
  return { marking, painter, setEnd, begin: () => setMarking(nothingMarked), leave: () => setMarking(null) };
}

interface MarkBarProps {
  mark: ReturnType<typeof useMarking>;
  whole: TimeSpan;
  cursor: number | null;
  onBegin: () => void;
  onExclude: (span: TimeSpan) => void;
}

/** Where a stretch is marked without a drag, what is marked so far, and what becomes of it. */
export function MarkBar({ mark, whole, cursor, onBegin, onExclude }: MarkBarProps) {
  const { timeZone } = useLab();
  const may = useMay('data.exclude');
  const { marking, setEnd, leave } = mark;
  if (marking === null)
    return (
      <View className="gap-1">
        <Button label="Mark a stretch to exclude" icon="mark" disabled={!may.ok} onPress={onBegin} className="self-start" testID="mark" />
        {may.ok ? null : <Label>{may.why}</Label>}
      </View>
    );
  const span = markedSpan(marking, whole);
  const opensEnd = marking.one !== null && marking.other === null;
  return (
    <View className="gap-3 border-l-4 border-lamp pl-3" testID="marking">
      <Body role="status">
        {span !== null
          ? `Marked: ${stretchWords({ startUtcMs: span.from, endUtcMs: span.to }, timeZone)}, ${zoneName(timeZone)}.`
          : opensEnd
            ? `From ${formatClock(marking.one ?? 0, { timeZone, precision: 'seconds' })}: now tap where it ends.`
            : 'Drag over the plot, or tap where the stretch begins and then where it ends.'}
      </Body>
      <View className="flex-row flex-wrap gap-3">
        <Button
          kind="primary"
          label="Exclude it"
          disabled={span === null}
          onPress={() => span !== null && onExclude(span)}
          testID="mark-exclude"
        />
        <Button
          label={opensEnd ? 'End at the cursor' : 'Begin at the cursor'}
          disabled={cursor === null}
          onPress={() => cursor !== null && setEnd(cursor)}
          testID="mark-end"
        />
        <Button kind="quiet" label="Leave it" onPress={leave} testID="mark-leave" />
      </View>
      <Label>Two fingers zoom meanwhile. By keyboard, on the plot: arrows move the cursor, Enter begins and ends.</Label>
    </View>
  );
}
