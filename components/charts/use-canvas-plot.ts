import { useEffect, useMemo, useRef, type RefObject } from 'react';
import UPlot from 'uplot';
import type { ThemeColors } from '@/components/theme';
import { MINUS, unitSign } from '@/shared/lib/format-number';
import { formatClock } from '@/shared/lib/format-time';
import { gapOf } from './curve';
import { panned, zoomed, type StepBand, type TimeSpan } from './deflection-plot-types';

interface CanvasPlotInput {
  host: RefObject<HTMLDivElement | null>;
  utcMs: ArrayLike<number>;
  value: ArrayLike<number>;
  unit: string;
  timeZone: string;
  heightPx: number;
  bands: readonly StepBand[];
  excluded: readonly TimeSpan[];
  colors: ThemeColors;
  span: TimeSpan;
  whole: TimeSpan;
  onSpan: (change: (before: TimeSpan) => TimeSpan) => void;
  onCursor: (utcMs: number | null) => void;
}

const bandPx = 10;
const font = (family: string) => `13px "${family}", sans-serif`;

/** Missing data become nulls, so that the line breaks where there was nothing. */
function withGaps(utcMs: ArrayLike<number>, value: ArrayLike<number>): [number[], (number | null)[]] {
  const gap = gapOf(utcMs);
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

/** Near above, far below, along the plot's edges, as in the swing strip. */
function drawBands(plot: UPlot, bands: readonly StepBand[], colors: ThemeColors) {
  const { ctx, bbox } = plot;
  const ratio = UPlot.pxRatio;
  ctx.save();
  ctx.beginPath();
  ctx.rect(bbox.left, bbox.top, bbox.width, bbox.height);
  ctx.clip();
  for (const band of bands) {
    if (band.lane === 'other') continue;
    const x1 = plot.valToPos(band.fromUtcMs, 'x', true);
    const x2 = plot.valToPos(band.toUtcMs, 'x', true);
    if (x2 < bbox.left || x1 > bbox.left + bbox.width) continue;
    const near = band.lane === 'near';
    ctx.fillStyle = near ? colors.near : colors.far;
    ctx.globalAlpha = 0.07;
    ctx.fillRect(x1, bbox.top, x2 - x1, bbox.height);
    ctx.globalAlpha = band.good === false ? 0.3 : 1;
    ctx.fillRect(x1, near ? bbox.top : bbox.top + bbox.height - bandPx * ratio, Math.max(1, x2 - x1 - ratio), bandPx * ratio);
    ctx.globalAlpha = 1;
    if (x2 - x1 > 16 * ratio)
      drawMark(ctx, {
        x: (x1 + x2) / 2,
        y: near ? bbox.top + (bandPx / 2) * ratio : bbox.top + bbox.height - (bandPx / 2) * ratio,
        half: 3.5 * ratio,
        up: near,
        color: colors.ink,
      });
  }
  ctx.restore();
}

/** Hatched over the whole height, so that it is told from a stand without its colour. */
function drawExcluded(plot: UPlot, excluded: readonly TimeSpan[], colors: ThemeColors) {
  const { ctx, bbox } = plot;
  const stepPx = 9 * UPlot.pxRatio;
  const right = bbox.left + bbox.width;
  for (const { from, to } of excluded) {
    const x1 = Math.max(bbox.left, plot.valToPos(from, 'x', true));
    const x2 = Math.min(right, Math.max(x1 + UPlot.pxRatio, plot.valToPos(to, 'x', true)));
    if (x2 <= x1) continue;
    ctx.save();
    ctx.beginPath();
    ctx.rect(x1, bbox.top, x2 - x1, bbox.height);
    ctx.clip();
    ctx.strokeStyle = colors.lamp;
    ctx.globalAlpha = 0.55;
    ctx.lineWidth = UPlot.pxRatio;
    ctx.strokeRect(x1, bbox.top, x2 - x1, bbox.height);
    ctx.beginPath();
    for (let x = x1 - bbox.height; x < x2; x += stepPx) {
      ctx.moveTo(x, bbox.top + bbox.height);
      ctx.lineTo(x + bbox.height, bbox.top);
    }
    ctx.stroke();
    ctx.restore();
  }
}

function drawMark(
  ctx: CanvasRenderingContext2D,
  { x, y, half, up, color }: { x: number; y: number; half: number; up: boolean; color: string },
) {
  const tip = up ? -half * 0.8 : half * 0.8;
  ctx.fillStyle = color;
  ctx.beginPath();
  ctx.moveTo(x - half, y - tip);
  ctx.lineTo(x + half, y - tip);
  ctx.lineTo(x, y + tip);
  ctx.fill();
}

function optionsOf(latest: RefObject<CanvasPlotInput>, width: number): UPlot.Options {
  const input = latest.current;
  const { colors, timeZone, unit, heightPx } = input;
  const axis = { stroke: colors.dim, grid: { stroke: colors.line, width: 1 }, ticks: { stroke: colors.line, width: 1, size: 4 } };
  const scaleOf = unit === 'rad' ? { factor: 1e3, sign: 'mrad' } : { factor: 1, sign: unitSign(unit) };
  return {
    width,
    height: heightPx,
    ms: 1,
    legend: { show: false },
    padding: [8, 22, 0, 0],
    cursor: { drag: { x: false, y: false, setScale: false }, y: false, points: { size: 8, fill: colors.lamp, stroke: colors.lamp } },
    scales: {
      x: { time: false, auto: false, min: input.span.from, max: input.span.to },
      y: { auto: true, range: (_, least, greatest) => roomyRange(least, greatest) },
    },
    series: [{}, { stroke: colors.text, width: 1.5, points: { show: false }, spanGaps: false }],
    axes: [
      {
        ...axis,
        font: font('Atkinson Hyperlegible Mono'),
        space: 84,
        values: (_, ticks) =>
          ticks.map((at) => formatClock(at, { timeZone, precision: (ticks[1] ?? at) - (ticks[0] ?? at) < 60_000 ? 'seconds' : 'short' })),
        incrs: timeIncrements,
      },
      {
        ...axis,
        font: font('Atkinson Hyperlegible Mono'),
        size: 48,
        label: scaleOf.sign,
        labelFont: font('Atkinson Hyperlegible Next'),
        labelSize: 20,
        values: (_, ticks) => ticks.map((y) => String(Number((y * scaleOf.factor).toPrecision(6))).replace('-', MINUS)),
      },
    ],
    hooks: {
      drawClear: [(plot) => drawBands(plot, latest.current.bands, colors), (plot) => drawExcluded(plot, latest.current.excluded, colors)],
      setCursor: [
        (plot) => latest.current.onCursor(plot.cursor.left == null || plot.cursor.left < 0 ? null : plot.posToVal(plot.cursor.left, 'x')),
      ],
    },
  };
}

const timeIncrements = [1, 2, 5, 10, 15, 30, 60, 120, 300, 600, 900, 1800, 3600, 7200, 10_800, 21_600, 43_200, 86_400].map((s) => s * 1000);

function roomyRange(least: number | null, greatest: number | null): [number, number] {
  if (least === null || greatest === null || !Number.isFinite(least) || !Number.isFinite(greatest)) return [-1, 1];
  const room = (greatest - least) * 0.14 || Math.abs(greatest) * 0.01 || 1e-6;
  return [least - room, greatest + room];
}

/** Draws on a canvas inside `host` and turns fingers, mouse and wheel into changes of the shown time. */
export function useCanvasPlot(input: CanvasPlotInput): void {
  const { host, utcMs, value, heightPx, colors, bands, excluded, unit, timeZone, span } = input;
  const data = useMemo(() => withGaps(utcMs, value), [utcMs, value]);
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
    const stopGestures = gestures(made, latest);
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
      stopGestures();
      made.destroy();
    };
  }, [host, heightPx, colors, unit, timeZone]);

  useEffect(() => {
    const drawn = plot.current;
    if (drawn === null) return;
    drawn.batch(() => {
      if (drawn.data !== (data as UPlot.AlignedData)) drawn.setData(data, false);
      drawn.setScale('x', { min: span.from, max: span.to });
    });
  }, [span, data, bands, excluded]);
}

const tapPx = 8;

function putCursor(plot: UPlot, { clientX, clientY }: { clientX: number; clientY: number }): void {
  const { left, top } = plot.over.getBoundingClientRect();
  plot.setCursor({ left: clientX - left, top: clientY - top });
}

/** One finger moves, two pinch, the wheel zooms; uPlot itself knows the mouse only. Vertical swipes still scroll the page. */
function gestures(plot: UPlot, latest: RefObject<CanvasPlotInput>): () => void {
  const over = plot.over;
  const touches = new Map<number, number>();
  let moved = 0;
  over.style.touchAction = 'pan-y';
  const valueAtX = (clientX: number) => plot.posToVal(clientX - over.getBoundingClientRect().left, 'x');
  const down = (event: PointerEvent) => {
    touches.set(event.pointerId, event.clientX);
    moved = 0;
    over.setPointerCapture?.(event.pointerId);
  };
  const move = (event: PointerEvent) => {
    const before = touches.get(event.pointerId);
    if (before === undefined) return;
    const { onSpan, whole } = latest.current;
    const others = [...touches].filter(([id]) => id !== event.pointerId).map(([, x]) => x);
    touches.set(event.pointerId, event.clientX);
    moved += Math.abs(event.clientX - before);
    if (others[0] === undefined) {
      const ms = valueAtX(before) - valueAtX(event.clientX);
      onSpan((span) => panned(span, whole, ms));
      return;
    }
    const apart = Math.max(10, Math.abs(event.clientX - others[0]));
    const factor = Math.max(10, Math.abs(before - others[0])) / apart;
    const at = valueAtX((event.clientX + others[0]) / 2);
    onSpan((span) => zoomed(span, whole, { at, factor }));
  };
  const up = (event: PointerEvent) => {
    touches.delete(event.pointerId);
    // A finger has no resting place to hover at: a tap puts the cursor where it was.
    if (event.type === 'pointerup' && event.pointerType !== 'mouse' && moved < tapPx) setTimeout(() => putCursor(plot, event), 0);
  };
  const wheel = (event: WheelEvent) => {
    event.preventDefault();
    const { onSpan, whole } = latest.current;
    const at = valueAtX(event.clientX);
    onSpan((span) => zoomed(span, whole, { at, factor: event.deltaY > 0 ? 1.25 : 0.8 }));
  };
  over.addEventListener('pointerdown', down);
  over.addEventListener('pointermove', move);
  for (const end of ['pointerup', 'pointercancel'] as const) over.addEventListener(end, up);
  over.addEventListener('wheel', wheel, { passive: false });
  return () => {
    over.removeEventListener('pointerdown', down);
    over.removeEventListener('pointermove', move);
    for (const end of ['pointerup', 'pointercancel'] as const) over.removeEventListener(end, up);
    over.removeEventListener('wheel', wheel);
  };
}
