import { unitSign } from '@/shared/lib/format-number';

/** One channel over time: what every plot of this kind is given, whoever draws it. */

export interface TimeSpan {
  from: number;
  to: number;
}

export interface StepBand {
  lane: 'near' | 'far' | 'other';
  fromUtcMs: number;
  toUtcMs: number;
  good: boolean | null;
}

/** What plots that stand under each other share: they move, zoom and read out together. */
export interface TimeView {
  /** The whole time that may be shown. */
  whole: TimeSpan;
  /** The time that is shown. */
  span: TimeSpan;
  /** The instant that is read out; null without one. */
  cursor: number | null;
  change: (change: (before: TimeSpan) => TimeSpan) => void;
  point: (utcMs: number | null) => void;
}

/** A finger or a mouse that marks a stretch instead of moving the plot. */
export interface Painter {
  /** Drawn over from one instant to another, in any order; told again and again as it goes. */
  onDrag: (fromUtcMs: number, toUtcMs: number) => void;
  onTap: (utcMs: number) => void;
}

export interface TimePlotProps {
  /** UTC ms, ascending. */
  utcMs: ArrayLike<number>;
  /** In `unit`. */
  value: ArrayLike<number>;
  unit: string;
  timeZone: string;
  /** Standard uncertainty that the channel's calibration leaves in a value, in `unit`; absent where none is known. */
  uOf?: ((value: number) => number) | undefined;
  /** What is shown, for those who do not see it. */
  title: string;
  view: TimeView;
  /** A longer step is missing data, ms; absent: 8 times the usual one. Infinite: the line is known between its points too. */
  gapMs?: number | undefined;
  /** Where the sources stood when. */
  bands?: readonly StepBand[] | undefined;
  /** Stretches whose samples are not evaluated. */
  excluded?: readonly TimeSpan[] | undefined;
  /** The stretch that is being marked. */
  marked?: TimeSpan | null | undefined;
  /** While it is there, dragging and tapping mark. */
  painter?: Painter | undefined;
  /** A tap or a click without a painter: the instant, and how far from it a finger may have meant, ms. */
  onTap?: ((utcMs: number, reachMs: number) => void) | undefined;
  /** Keys beside those that move and zoom; true where it was taken. */
  onKey?: ((key: string) => boolean) | undefined;
  /** What the keys do, said after the title. */
  keyWords?: string | undefined;
  /** Clock times under it. */
  axis?: boolean | undefined;
  heightPx?: number | undefined;
  testID?: string | undefined;
}

/** What the numbers beside a plot are in: radians are drawn in mrad. */
export const axisUnit = (unit: string): string => (unit === 'rad' ? 'mrad' : unitSign(unit));

/** Zooms about `at` by `factor` (below 1: closer), kept within the whole and no closer than `leastMs`. */
export function zoomed(span: TimeSpan, whole: TimeSpan, change: { at: number; factor: number; leastMs?: number }): TimeSpan {
  const length = Math.min(whole.to - whole.from, Math.max(change.leastMs ?? 2000, (span.to - span.from) * change.factor));
  const share = (change.at - span.from) / (span.to - span.from || 1);
  return within({ from: change.at - share * length, to: change.at + (1 - share) * length }, whole);
}

/** Moves by `ms`, kept within the whole. */
export const panned = (span: TimeSpan, whole: TimeSpan, ms: number): TimeSpan => within({ from: span.from + ms, to: span.to + ms }, whole);

/** Moves just as far as it takes to show an instant. */
export function showing(span: TimeSpan, whole: TimeSpan, utcMs: number): TimeSpan {
  if (utcMs < span.from) return panned(span, whole, utcMs - span.from);
  return utcMs > span.to ? panned(span, whole, utcMs - span.to) : span;
}

/** As long as before, where the whole allows it, and inside of it. */
export function within(span: TimeSpan, whole: TimeSpan): TimeSpan {
  const length = Math.min(span.to - span.from, whole.to - whole.from);
  const from = Math.min(Math.max(span.from, whole.from), whole.to - length);
  return { from, to: from + length };
}
