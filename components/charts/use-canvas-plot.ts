import { useEffect, useMemo, useRef, type RefObject } from 'react';
import UPlot from 'uplot';
import type { ThemeColors } from '@/components/theme';
import { MINUS } from '@/shared/lib/format-number';
import { formatClock } from '@/shared/lib/format-time';
import { drawBands, drawExcluded, drawMarked } from './canvas-drawing';
import { listenToFingers, type GestureInput } from './canvas-gestures';
import { gapOf } from './curve';
import type { StepBand, TimePlotProps, TimeSpan } from './time-plot-types';

interface CanvasPlotInput extends GestureInput, Pick<TimePlotProps, 'utcMs' | 'value' | 'unit' | 'timeZone' | 'gapMs'> {
  host: RefObject<HTMLDivElement | null>;
  heightPx: number;
  bands: readonly StepBand[];
  excluded: readonly TimeSpan[];
  marked: TimeSpan | null;
  axis: boolean;
  colors: ThemeColors;
}

const font = (family: string) => `13px "${family}", sans-serif`;

/** Missing data become nulls, so that the line breaks where there was nothing. */
function withGaps({ utcMs, value, gapMs }: Pick<TimePlotProps, 'utcMs' | 'value' | 'gapMs'>): [number[], (number | null)[]] {
  const gap = gapMs ?? gapOf(utcMs);
  const xs: number[] = [];
  const ys: (number | null)[] = [];
  for (let i = 0; i < utcMs.length; i += 1) {
    const x = utcMs[i] as number;
    const previous = xs.at(-1);
    if (previous !== undefined && x - previous > gap) {
      xs.push((x + previous) / 2);
      ys.push(null);
    }
    const y = value[i] as number;
    xs.push(x);
    ys.push(Number.isFinite(y) ? y : null);
  }
  return [xs, ys];
}

function optionsOf(latest: RefObject<CanvasPlotInput>, width: number): UPlot.Options {
  const { colors, timeZone, unit, gapMs, heightPx, axis: hasTimes, view } = latest.current;
  const axis = { stroke: colors.dim, grid: { stroke: colors.line, width: 1 }, ticks: { stroke: colors.line, width: 1, size: 4 } };
  const factor = unit === 'rad' ? 1e3 : 1;
  return {
    width,
    height: heightPx,
    ms: 1,
    legend: { show: false },
    padding: [8, 22, 0, 0],
    cursor: {
      bind: noMouse,
      drag: noDrag,
      y: false,
      points: { show: gapMs !== Infinity, size: 8, fill: colors.lamp, stroke: colors.lamp },
    },
    scales: {
      x: { time: false, auto: false, min: view.span.from, max: view.span.to },
      y: { auto: true, range: (_, least, greatest) => roomyRange(least, greatest) },
    },
    series: [{}, { stroke: colors.text, width: 1.5, points: { show: false }, spanGaps: false }],
    axes: [
      {
        ...axis,
        font: font('Atkinson Hyperlegible Mono'),
        space: 84,
        size: hasTimes ? 34 : 8,
        values: (_, ticks) => {
          const precision = (ticks[1] ?? Infinity) - (ticks[0] ?? 0) < 60_000 ? 'seconds' : 'short';
          return ticks.map((at) => (hasTimes ? formatClock(at, { timeZone, precision }) : null));
        },
        incrs: timeIncrements,
      },
      {
        ...axis,
        font: font('Atkinson Hyperlegible Mono'),
        size: 66,
        values: (_, ticks) => ticks.map((y) => String(Number((y * factor).toPrecision(6))).replace('-', MINUS)),
      },
    ],
    hooks: {
      drawClear: [(plot) => drawBands(plot, latest.current.bands, colors), (plot) => drawExcluded(plot, latest.current.excluded, colors)],
      draw: [(plot) => drawMarked(plot, latest.current.marked, colors), (plot) => putCursor(plot, latest.current.view.cursor)],
    },
  };
}

/** The cursor belongs to all linked plots: none of them follows the mouse by itself. */
const noMouse = Object.fromEntries(
  ['mousemove', 'mousedown', 'mouseup', 'mouseenter', 'mouseleave', 'click', 'dblclick'].map((name) => [name, () => null]),
);

/** It would swallow clicks, too, that it takes for the end of a drag. */
const noDrag: UPlot.Cursor.Drag = { x: false, y: false, setScale: false, click: () => undefined };

const timeIncrements = [1, 2, 5, 10, 15, 30, 60, 120, 300, 600, 900, 1800, 3600, 7200, 10_800, 21_600, 43_200, 86_400].map((s) => s * 1000);

function roomyRange(least: number | null, greatest: number | null): [number, number] {
  if (least === null || greatest === null || !Number.isFinite(least) || !Number.isFinite(greatest)) return [-1, 1];
  const room = (greatest - least) * 0.14 || Math.abs(greatest) * 0.01 || 1e-6;
  return [least - room, greatest + room];
}

function putCursor(plot: UPlot, utcMs: number | null): void {
  const left = utcMs === null ? -10 : plot.valToPos(utcMs, 'x');
  const shown = left >= 0 && left <= plot.bbox.width / UPlot.pxRatio;
  plot.setCursor(shown ? { left, top: 1 } : { left: -10, top: -10 }, false);
}

/** Draws on a canvas inside `host` and turns fingers, mouse and wheel into changes of the shown time. */
export function useCanvasPlot(input: CanvasPlotInput): void {
  const { host, heightPx, colors, unit, timeZone, axis, view, bands, excluded, marked, utcMs, value, gapMs } = input;
  const data = useMemo(() => withGaps({ utcMs, value, gapMs }), [utcMs, value, gapMs]);
  const plot = useRef<UPlot | null>(null);
  const latest = useRef(input);
  const latestData = useRef(data);
  useEffect(() => {
    latest.current = input;
    latestData.current = data;
  });

  useEffect(() => {
    const element = host.current;
    if (element === null) return undefined;
    const made = new UPlot(optionsOf(latest, Math.max(200, element.clientWidth)), latestData.current, element);
    plot.current = made;
    // The library's own line is blue, also where nothing may be.
    made.over.querySelector<HTMLElement>('.u-cursor-x')?.style.setProperty('border-right-color', colors.lamp);
    const deafen = listenToFingers(made, latest);
    const observer =
      typeof ResizeObserver === 'undefined'
        ? null
        : new ResizeObserver(() => made.setSize({ width: Math.max(200, element.clientWidth), height: heightPx }));
    observer?.observe(element);
    // A canvas neither asks for a font nor redraws by itself when it arrives.
    void document.fonts
      ?.load(font('Atkinson Hyperlegible Mono'))
      .then(() => (plot.current === made ? made.redraw(false, true) : undefined));
    return () => {
      plot.current = null;
      observer?.disconnect();
      deafen();
      made.destroy();
    };
  }, [host, heightPx, colors, unit, timeZone, axis]);

  const { span, cursor } = view;
  useEffect(() => {
    const drawn = plot.current;
    if (drawn === null) return;
    drawn.batch(() => {
      if (drawn.data !== (data as UPlot.AlignedData)) drawn.setData(data, false);
      drawn.setScale('x', { min: span.from, max: span.to });
    });
  }, [span, data, bands, excluded, marked]);
  useEffect(() => {
    if (plot.current !== null) putCursor(plot.current, cursor);
  }, [cursor]);
}
