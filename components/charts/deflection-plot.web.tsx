import 'uplot/dist/uPlot.min.css';
import { useCallback, useEffect, useMemo, useRef, useState } from 'react';
import { View } from 'react-native';
import { useTheme } from '@/components/theme';
import { IconButton, Label, Num } from '@/components/ui';
import { formatReading } from '@/shared/lib/format-angle';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import { extent, valueAt } from './curve';
import { panned, zoomed, type DeflectionPlotProps, type StepBand, type TimeSpan } from './deflection-plot-types';
import { HiddenTable } from './hidden-table';
import { useCanvasPlot } from './use-canvas-plot';

const noBands: readonly StepBand[] = [];
const noSpans: readonly TimeSpan[] = [];

/** Many points on a canvas: drag or arrow keys to move, pinch, wheel, + and − or the buttons to zoom, a cursor that reads out. */
export function DeflectionPlot(props: DeflectionPlotProps) {
  const { utcMs, value, unit, timeZone, title, heightPx = 260, bands, excluded, onWindow } = props;
  const { colors } = useTheme();
  const host = useRef<HTMLDivElement | null>(null);
  const from = props.whole?.from ?? utcMs[0] ?? 0;
  const to = Math.max(from + 1, props.whole?.to ?? utcMs[utcMs.length - 1] ?? 1);
  const whole = useMemo<TimeSpan>(() => ({ from, to }), [from, to]);
  const [chosen, setChosen] = useState<TimeSpan | null>(null);
  const inside = chosen !== null && chosen.from >= whole.from && chosen.to <= whole.to;
  const span = inside ? chosen : whole;
  const setSpan = useCallback((change: (before: TimeSpan) => TimeSpan) => setChosen((before) => change(before ?? whole)), [whole]);
  const [cursor, setCursor] = useState<number | null>(null);
  const { from: shownFrom, to: shownTo } = span;
  useEffect(() => onWindow?.(shownFrom, shownTo), [shownFrom, shownTo, onWindow]);
  useCanvasPlot({
    host,
    utcMs,
    value,
    unit,
    timeZone,
    heightPx,
    bands: bands ?? noBands,
    excluded: excluded ?? noSpans,
    colors,
    span,
    whole,
    onSpan: setSpan,
    onCursor: setCursor,
  });

  const middle = (span.from + span.to) / 2;
  const zoom = (factor: number) => setSpan((before) => zoomed(before, whole, { at: cursor ?? middle, factor }));
  const pan = (share: number) => setSpan((before) => panned(before, whole, (before.to - before.from) * share));
  const keys: Record<string, () => void> = {
    ArrowLeft: () => pan(-0.2),
    ArrowRight: () => pan(0.2),
    '+': () => zoom(0.5),
    '=': () => zoom(0.5),
    '-': () => zoom(2),
    Home: () => setChosen(null),
  };
  const shownAll = span.from <= whole.from && span.to >= whole.to;
  return (
    <View className="w-full min-w-0 gap-2" testID="deflection-plot">
      <View className="min-h-target flex-row items-center justify-between gap-2">
        <Readout {...{ utcMs, value, unit, timeZone, cursor }} />
        <View className="flex-row">
          <IconButton icon="minus" label="Show a longer time" onPress={() => zoom(2)} disabled={shownAll} />
          <IconButton icon="plus" label="Show a shorter time" onPress={() => zoom(0.5)} />
          <IconButton icon="repeat" label="Show all" onPress={() => setChosen(null)} disabled={shownAll} />
        </View>
      </View>
      <div
        ref={host}
        role="img"
        aria-label={`${title}. Arrow keys move, plus and minus zoom, Home shows all.`}
        tabIndex={0}
        style={{ width: '100%', minWidth: 0, height: heightPx }}
        onKeyDown={(event) => {
          const act = keys[event.key];
          if (act === undefined) return;
          event.preventDefault();
          act();
        }}
      />
      <PlotTable {...{ utcMs, value, unit, timeZone, title, span }} />
    </View>
  );
}

function Readout({
  utcMs,
  value,
  unit,
  timeZone,
  cursor,
}: Pick<DeflectionPlotProps, 'utcMs' | 'value' | 'unit' | 'timeZone'> & { cursor: number | null }) {
  if (cursor === null) return <Label className="shrink">{`Times in ${zoneName(timeZone)}`}</Label>;
  const reading = valueAt({ x: utcMs, y: value }, cursor);
  return (
    <View className="shrink flex-row flex-wrap items-baseline gap-x-3">
      <Num size={17}>{reading === null ? 'no data' : formatReading(reading, unit)}</Num>
      <Label className="font-mono tabular">{formatClock(cursor, { timeZone, precision: 'seconds' })}</Label>
    </View>
  );
}

/** Least and greatest in twelve parts of the shown time: what a listener can take in. */
function PlotTable({
  utcMs,
  value,
  unit,
  timeZone,
  title,
  span,
}: Pick<DeflectionPlotProps, 'utcMs' | 'value' | 'unit' | 'timeZone' | 'title'> & { span: TimeSpan }) {
  const rows = useMemo(() => {
    const length = (span.to - span.from) / 12;
    return Array.from({ length: 12 }, (_, index) => {
      const from = span.from + index * length;
      const found = extent({ x: utcMs, y: value }, from, from + length);
      const cells = found === null ? ['no data', 'no data'] : found.map((y) => formatReading(y, unit));
      return [formatClock(from, { timeZone, precision: 'seconds' }), ...cells];
    });
  }, [utcMs, value, unit, timeZone, span]);
  return <HiddenTable caption={title} columns={['From', 'Least', 'Greatest']} rows={rows} />;
}
