export interface StepBand {
  lane: 'near' | 'far' | 'other';
  fromUtcMs: number;
  toUtcMs: number;
  good: boolean | null;
}

export interface DeflectionPlotProps {
  /** UTC ms, ascending. */
  utcMs: ArrayLike<number>;
  /** In `unit`. */
  value: ArrayLike<number>;
  unit: string;
  timeZone: string;
  /** Where the sources stood when. */
  bands?: readonly StepBand[] | undefined;
  /** Stretches whose samples are not evaluated. */
  excluded?: readonly TimeSpan[] | undefined;
  heightPx?: number | undefined;
  title: string;
  /** The whole time that may be shown, when the data given are only a part of it. */
  whole?: TimeSpan | undefined;
  /** Called when the shown part changes, so that finer data may be fetched. */
  onWindow?: ((fromUtcMs: number, toUtcMs: number) => void) | undefined;
}

export interface TimeSpan {
  from: number;
  to: number;
}

/** Zooms about `at` by `factor` (below 1: closer), kept within the whole and no closer than `leastMs`. */
export function zoomed(span: TimeSpan, whole: TimeSpan, change: { at: number; factor: number; leastMs?: number }): TimeSpan {
  const length = Math.min(whole.to - whole.from, Math.max(change.leastMs ?? 2000, (span.to - span.from) * change.factor));
  const share = (change.at - span.from) / (span.to - span.from || 1);
  return clamped({ from: change.at - share * length, to: change.at + (1 - share) * length }, whole);
}

/** Moves by `ms`, kept within the whole. */
export const panned = (span: TimeSpan, whole: TimeSpan, ms: number): TimeSpan => clamped({ from: span.from + ms, to: span.to + ms }, whole);

function clamped(span: TimeSpan, whole: TimeSpan): TimeSpan {
  const length = Math.min(span.to - span.from, whole.to - whole.from);
  const from = Math.min(Math.max(span.from, whole.from), whole.to - length);
  return { from, to: from + length };
}
