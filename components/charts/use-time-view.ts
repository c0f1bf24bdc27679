import { useCallback, useMemo, useState } from 'react';
import { panned, showing, within, zoomed, type TimeSpan, type TimeView } from './time-plot-types';

/** How far the cursor goes with a press of a key, as a share of what is shown. */
const cursorShare = 0.01;
const panShare = 0.2;

/** The hand of linked plots: what buttons and keys do to all of them at once. */
export interface TimeHand extends TimeView {
  /** Nothing is left to zoom out to. */
  shownAll: boolean;
  zoom: (factor: number) => void;
  /** By a share of what is shown: to the left where it is negative. */
  pan: (by: 1 | -1) => void;
  showAll: () => void;
  /** Moves the cursor a little, and the plot with it where it would leave it. */
  step: (by: 1 | -1) => void;
}

/** The time that linked plots show: all of it, or from `start` on the part that a link leads to. */
export function useTimeView({ from, to }: TimeSpan, start: { span: TimeSpan | null; cursor: number | null }): TimeHand {
  const whole = useMemo<TimeSpan>(() => ({ from, to: Math.max(from + 1, to) }), [from, to]);
  const [chosen, setChosen] = useState<TimeSpan | null>(start.span);
  const [cursor, setCursor] = useState<number | null>(start.cursor);
  const span = useMemo(() => (chosen === null ? whole : within(chosen, whole)), [chosen, whole]);
  const change = useCallback(
    (next: (before: TimeSpan) => TimeSpan) => setChosen((before) => next(before === null ? whole : within(before, whole))),
    [whole],
  );
  const middle = (span.from + span.to) / 2;
  const inside = cursor !== null && cursor >= span.from && cursor <= span.to ? cursor : middle;
  return {
    whole,
    span,
    cursor,
    change,
    point: setCursor,
    shownAll: span.from <= whole.from && span.to >= whole.to,
    zoom: (factor) => change((before) => zoomed(before, whole, { at: inside, factor })),
    pan: (by) => change((before) => panned(before, whole, by * panShare * (before.to - before.from))),
    showAll: () => setChosen(null),
    step: (by) => {
      const at = Math.min(whole.to, Math.max(whole.from, cursor === null ? middle : inside + by * cursorShare * (span.to - span.from)));
      setCursor(at);
      change((before) => showing(before, whole, at));
    },
  };
}
