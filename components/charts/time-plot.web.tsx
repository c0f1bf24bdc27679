import 'uplot/dist/uPlot.min.css';
import { memo, useMemo, useRef } from 'react';
import { View } from 'react-native';
import { useTheme } from '@/components/theme';
import { formatKnownReading } from '@/shared/lib/format-angle';
import { formatClock } from '@/shared/lib/format-time';
import { extent } from './curve';
import { HiddenTable } from './hidden-table';
import type { StepBand, TimePlotProps, TimeSpan } from './time-plot-types';
import { useCanvasPlot } from './use-canvas-plot';

const noBands: readonly StepBand[] = [];
const noSpans: readonly TimeSpan[] = [];

/** Many points on a canvas: drag to move or, with a painter, to mark; pinch and wheel zoom. Keys are those of the page. */
export function TimePlot(props: TimePlotProps) {
  const { utcMs, value, unit, timeZone, title, view, gapMs, painter, onTap, onKey, keyWords = '', axis = true, heightPx = 260 } = props;
  const { colors } = useTheme();
  const host = useRef<HTMLDivElement | null>(null);
  useCanvasPlot({
    host,
    utcMs,
    value,
    unit,
    timeZone,
    gapMs,
    heightPx,
    axis,
    bands: props.bands ?? noBands,
    excluded: props.excluded ?? noSpans,
    marked: props.marked ?? null,
    colors,
    view,
    painter,
    onTap,
  });
  return (
    <View className="w-full min-w-0" testID={props.testID}>
      <div
        ref={host}
        role="img"
        aria-label={`${title}.${keyWords === '' ? '' : ` ${keyWords}`}`}
        tabIndex={0}
        style={{ width: '100%', minWidth: 0, height: heightPx, cursor: painter === undefined ? undefined : 'crosshair' }}
        onKeyDown={(event) => {
          if (event.ctrlKey || event.metaKey || event.altKey) return;
          if (onKey?.(event.shiftKey && event.key.startsWith('Arrow') ? `Shift+${event.key}` : event.key) === true) event.preventDefault();
        }}
      />
      <PlotTable {...{ utcMs, value, unit, uOf: props.uOf, timeZone, title }} from={view.span.from} to={view.span.to} />
    </View>
  );
}

type PlotTableProps = Pick<TimePlotProps, 'utcMs' | 'value' | 'unit' | 'uOf' | 'timeZone' | 'title'> & TimeSpan;

/** Least and greatest in twelve parts of the shown time: what a listener can take in. */
const PlotTable = memo(function PlotTable({ utcMs, value, unit, uOf, timeZone, title, from, to }: PlotTableProps) {
  const rows = useMemo(() => {
    const length = (to - from) / 12;
    return Array.from({ length: 12 }, (_, index) => {
      const start = from + index * length;
      const found = extent({ x: utcMs, y: value }, start, start + length);
      const cells =
        found === null
          ? ['no data', 'no data']
          : found.map((y) => formatKnownReading({ value: y, u: uOf === undefined ? null : uOf(y) }, unit));
      return [formatClock(start, { timeZone, precision: 'seconds' }), ...cells];
    });
  }, [utcMs, value, unit, uOf, timeZone, from, to]);
  return <HiddenTable caption={title} columns={['From', 'Least', 'Greatest']} rows={rows} />;
});
