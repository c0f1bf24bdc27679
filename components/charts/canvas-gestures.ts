import type UPlot from 'uplot';
import { panned, zoomed, type Painter, type TimeView } from './time-plot-types';

export interface GestureInput {
  view: TimeView;
  painter?: Painter | undefined;
  onTap?: ((utcMs: number, reachMs: number) => void) | undefined;
}

/** A finger that moves less taps, px; and so far from what it means it may come down. */
const tapPx = 8;
const reachPx = 12;

/** Between two fingers, px; those that touch each other count as a little apart. */
const apart = (one: number, other: number) => Math.max(10, Math.abs(one - other));

/**
 * One finger moves or, with a painter, marks; two pinch, the wheel zooms, a mouse that hovers and a finger that taps put the cursor. Vertical
 * swipes still scroll the page.
 */
export function listenToFingers(plot: UPlot, latest: { readonly current: GestureInput }): () => void {
  const over = plot.over;
  const touches = new Map<number, number>();
  let moved = 0;
  /** Where a stroke of marking began; null where there is none, or a second finger has come. */
  let strokeFrom: number | null = null;
  over.style.touchAction = 'pan-y';
  const timeAt = (clientX: number) => plot.posToVal(clientX - over.getBoundingClientRect().left, 'x');

  const down = (event: PointerEvent) => {
    touches.set(event.pointerId, event.clientX);
    moved = 0;
    strokeFrom = touches.size === 1 ? timeAt(event.clientX) : null;
    over.setPointerCapture?.(event.pointerId);
  };
  const move = (event: PointerEvent) => {
    const { view, painter } = latest.current;
    const before = touches.get(event.pointerId);
    if (before === undefined) {
      if (event.pointerType === 'mouse') view.point(timeAt(event.clientX));
      return;
    }
    const others = [...touches].filter(([id]) => id !== event.pointerId).map(([, x]) => x);
    touches.set(event.pointerId, event.clientX);
    moved += Math.abs(event.clientX - before);
    if (others[0] !== undefined) {
      const factor = apart(before, others[0]) / apart(event.clientX, others[0]);
      const at = timeAt((event.clientX + others[0]) / 2);
      view.change((span) => zoomed(span, view.whole, { at, factor }));
      return;
    }
    if (painter !== undefined) {
      if (strokeFrom !== null && moved >= tapPx) painter.onDrag(strokeFrom, timeAt(event.clientX));
      return;
    }
    const ms = timeAt(before) - timeAt(event.clientX);
    view.change((span) => panned(span, view.whole, ms));
  };
  const up = (event: PointerEvent) => void touches.delete(event.pointerId);
  // Not when the finger goes up: a sheet that opened then would get the click that follows, and close.
  const click = (event: MouseEvent) => {
    if (moved >= tapPx) return;
    const { view, painter, onTap } = latest.current;
    const at = timeAt(event.clientX);
    view.point(at);
    if (painter !== undefined) painter.onTap(at);
    else onTap?.(at, (reachPx * (view.span.to - view.span.from)) / Math.max(1, over.clientWidth));
  };
  const wheel = (event: WheelEvent) => {
    event.preventDefault();
    const { view } = latest.current;
    const at = timeAt(event.clientX);
    view.change((span) => zoomed(span, view.whole, { at, factor: event.deltaY > 0 ? 1.25 : 0.8 }));
  };
  const deaf = new AbortController();
  const { signal } = deaf;
  over.addEventListener('pointerdown', down, { signal });
  over.addEventListener('pointermove', move, { signal });
  for (const end of ['pointerup', 'pointercancel'] as const) over.addEventListener(end, up, { signal });
  over.addEventListener('click', click, { signal });
  over.addEventListener('wheel', wheel, { passive: false, signal });
  return () => deaf.abort();
}
