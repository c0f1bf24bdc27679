import type { TimeSpan } from './time-plot-types';

/** A stretch of time that a person marks, end by end or in one go. Pure. */

export interface Marking {
  /** The end that was set first; null before. */
  one: number | null;
  other: number | null;
}

export const nothingMarked: Marking = { one: null, other: null };

/** Sets the next end: the first, then the other; a third begins anew. */
export const withEnd = ({ one, other }: Marking, utcMs: number): Marking =>
  one === null || other !== null ? { one: utcMs, other: null } : { one, other: utcMs };

/** From one end to the other, within `whole`; null before both are set, and while they are the same instant. */
export function markedSpan({ one, other }: Marking, whole: TimeSpan): TimeSpan | null {
  if (one === null || other === null) return null;
  const kept = (at: number) => Math.min(whole.to, Math.max(whole.from, at));
  const [from, to] = [kept(Math.min(one, other)), kept(Math.max(one, other))];
  return to > from ? { from, to } : null;
}

/** What is drawn of it: one end alone is drawn as a line. */
export const drawnMark = (marking: Marking, whole: TimeSpan): TimeSpan | null =>
  markedSpan(marking, whole) ?? (marking.one === null ? null : { from: marking.one, to: marking.one });
