import { curveSegments, extent, type Series } from './curve';
import { isMotion, laneOf, standsOf, type Lane, type Stand, type StripStep } from './strip-model';

/** Layout of the swing strip in pixels: near lane above, far lane below, the deflection between. Pure. */

export interface StripWindow {
  fromUtcMs: number;
  toUtcMs: number;
}

export interface StripInput {
  steps: readonly StripStep[];
  window: StripWindow;
  widthPx: number;
  heightPx: number;
  /** Height of a lane; 18 on a full strip, 8 on a miniature. */
  lanePx: number;
  /** x in UTC ms, y in rad. */
  measured?: Series | null | undefined;
  predicted?: Series | null | undefined;
  equilibrium?: Series | null | undefined;
  nowUtcMs?: number | null | undefined;
  selectedKey?: string | null | undefined;
}

export interface StripBlock {
  key: string;
  keys: string[];
  lane: Lane;
  x: number;
  y: number;
  width: number;
  height: number;
  phase: Stand['phase'];
  measured: boolean;
  bad: boolean;
  cutShort: boolean;
  selected: boolean;
  /** Whether the mark that tells the lane without colour fits in. */
  marked: boolean;
}

export interface StripSwing {
  key: string;
  x1: number;
  y1: number;
  x2: number;
  y2: number;
  planned: boolean;
  selected: boolean;
}

export interface StripLayout {
  blocks: StripBlock[];
  swings: StripSwing[];
  measured: [number, number][][];
  predicted: [number, number][][];
  /** Dashed lines at the equilibria of the stands, where a prediction gives them. */
  equilibria: { x1: number; x2: number; y: number; planned: boolean }[];
  nowX: number | null;
  /** The newest measured point, at the now-line. */
  nowDot: { x: number; y: number } | null;
  /** Nothing has happened yet: the plan is the whole picture and is drawn in full strength. */
  onlyPlanned: boolean;
  /** So many stands that lines must be thinner. */
  dense: boolean;
  /** Deflection at the top and the bottom of the curve's room; null without any curve. */
  rangeRad: [number, number] | null;
  xToPx: (utcMs: number) => number;
  pxToX: (px: number) => number;
  yToPx: (rad: number) => number;
}

/** Least width of a block in pixels, so that a short dwell in a long night stays to be seen. */
const MIN_BLOCK_PX = 1.5;
const MARK_ROOM_PX = 7;

/** From the first step's start to the last one's end. */
export function wholeWindow(steps: readonly StripStep[]): StripWindow {
  const first = steps[0];
  if (!first) return { fromUtcMs: 0, toUtcMs: 1 };
  const toUtcMs = steps.reduce((latest, step) => Math.max(latest, step.endUtcMs), first.startUtcMs + 1000);
  return { fromUtcMs: first.startUtcMs, toUtcMs };
}

/** A window around the present: `beats` stands back and one ahead, as on the run screen; the whole strip when that is shorter. */
export function nowWindow(steps: readonly StripStep[], nowUtcMs: number, beats = 4): StripWindow {
  const whole = wholeWindow(steps);
  const stands = standsOf(steps);
  const current = stands.findLastIndex((stand) => stand.startUtcMs <= nowUtcMs);
  if (current < 0) return whole;
  const lengths = stands.slice(Math.max(0, current - beats), current + 1).map((stand) => stand.endUtcMs - stand.startUtcMs);
  const typical = Math.max(30_000, [...lengths].sort((a, b) => a - b)[lengths.length >> 1] ?? 60_000);
  const fromUtcMs = Math.max(whole.fromUtcMs, nowUtcMs - beats * typical * 1.02);
  return { fromUtcMs, toUtcMs: Math.max(fromUtcMs + typical, Math.min(whole.toUtcMs, nowUtcMs + typical * 1.9)) };
}

function rangeOf(input: StripInput): [number, number] | null {
  const { fromUtcMs, toUtcMs } = input.window;
  const spans = [input.measured, input.predicted, input.equilibrium]
    .flatMap((series) => (series ? [extent(series, fromUtcMs, toUtcMs)] : []))
    .filter((span) => span !== null);
  if (spans.length === 0) return null;
  const least = Math.min(...spans.map(([low]) => low));
  const greatest = Math.max(...spans.map(([, high]) => high));
  const room = Math.max((greatest - least) * 0.07, 1e-9);
  return [least - room, greatest + room];
}

/** Middle of a lane: near above, far below, all else between. */
function laneY(lane: Lane, { heightPx, lanePx }: StripInput): number {
  if (lane === 'near') return lanePx / 2;
  if (lane === 'far') return heightPx - lanePx / 2;
  return heightPx / 2;
}

function blocksOf(input: StripInput, xToPx: (utcMs: number) => number): StripBlock[] {
  const { window, lanePx, selectedKey } = input;
  const otherPx = Math.max(3, Math.round(lanePx / 4));
  return standsOf(input.steps)
    .filter((stand) => stand.endUtcMs > window.fromUtcMs && stand.startUtcMs < window.toUtcMs)
    .map((stand) => {
      const left = Math.max(0, xToPx(stand.startUtcMs));
      const right = Math.min(input.widthPx, xToPx(stand.endUtcMs));
      const spacing = right - left > 6 ? 1 : 0;
      const width = Math.max(MIN_BLOCK_PX, right - left - spacing);
      const height = stand.lane === 'other' ? otherPx : lanePx;
      return {
        key: stand.keys[0] as string,
        keys: stand.keys,
        lane: stand.lane,
        x: left,
        y: laneY(stand.lane, input) - height / 2,
        width,
        height,
        phase: stand.phase,
        measured: stand.measured,
        bad: stand.good === false,
        cutShort: stand.cutShort,
        selected: selectedKey != null && stand.keys.includes(selectedKey),
        marked: stand.lane !== 'other' && width >= MARK_ROOM_PX && lanePx >= 12,
      };
    });
}

function swingsOf(input: StripInput, xToPx: (utcMs: number) => number): StripSwing[] {
  const { window, lanePx } = input;
  let lane: Lane = 'other';
  const swings: StripSwing[] = [];
  for (const step of input.steps) {
    const from = lane;
    lane = laneOf(step.station);
    if (!isMotion(step)) continue;
    if (step.endUtcMs < window.fromUtcMs || step.startUtcMs > window.toUtcMs) continue;
    const inward = (of: Lane) => laneY(of, input) + (of === 'near' ? lanePx / 2 : of === 'far' ? -lanePx / 2 : 0);
    swings.push({
      key: step.key,
      x1: xToPx(step.startUtcMs),
      y1: inward(from),
      x2: xToPx(step.endUtcMs),
      y2: inward(lane),
      planned: step.phase === 'planned',
      selected: input.selectedKey === step.key,
    });
  }
  return swings;
}

function equilibriaOf(input: StripInput, scale: Pick<StripLayout, 'xToPx' | 'yToPx'>): StripLayout['equilibria'] {
  const series = input.equilibrium;
  if (!series || series.x.length === 0) return [];
  return standsOf(input.steps).flatMap((stand) => {
    if (stand.endUtcMs < input.window.fromUtcMs || stand.startUtcMs > input.window.toUtcMs) return [];
    const middle = (stand.startUtcMs + stand.endUtcMs) / 2;
    const nearest = nearestIndex(series.x, middle);
    const at = series.x[nearest] as number;
    if (at < stand.startUtcMs || at > stand.endUtcMs) return [];
    const x1 = Math.max(0, scale.xToPx(stand.startUtcMs));
    const x2 = Math.min(input.widthPx, scale.xToPx(stand.endUtcMs));
    return [{ x1, x2, y: scale.yToPx(series.y[nearest] as number), planned: stand.phase === 'planned' }];
  });
}

function nearestIndex(values: ArrayLike<number>, x: number): number {
  let best = 0;
  for (let i = 1; i < values.length; i += 1) if (Math.abs((values[i] as number) - x) < Math.abs((values[best] as number) - x)) best = i;
  return best;
}

/** Everything of a strip in pixels. */
export function layoutStrip(input: StripInput): StripLayout {
  const { window, widthPx, heightPx, lanePx } = input;
  const spanMs = Math.max(1, window.toUtcMs - window.fromUtcMs);
  const xToPx = (utcMs: number) => ((utcMs - window.fromUtcMs) / spanMs) * widthPx;
  const pxToX = (px: number) => window.fromUtcMs + (px / widthPx) * spanMs;
  const rangeRad = rangeOf(input);
  const room = { top: lanePx + 5, bottom: heightPx - lanePx - 5 };
  const yToPx = (rad: number) => {
    if (!rangeRad) return heightPx / 2;
    const share = (rad - rangeRad[0]) / (rangeRad[1] - rangeRad[0]);
    return room.bottom - share * (room.bottom - room.top);
  };
  const curve = (series: Series | null | undefined, fromUtcMs: number, toUtcMs: number) =>
    series && fromUtcMs < toUtcMs ? curveSegments(series, { xToPx, yToPx, fromX: fromUtcMs, toX: toUtcMs }) : [];
  const now = input.nowUtcMs ?? null;
  const nowX = now !== null && now >= window.fromUtcMs && now <= window.toUtcMs ? xToPx(now) : null;
  const measured = curve(input.measured, window.fromUtcMs, window.toUtcMs);
  const blocks = blocksOf(input, xToPx);
  return {
    onlyPlanned: now === null && input.steps.every((step) => step.phase === 'planned'),
    dense: blocks.length > 0 && widthPx / blocks.length < 18,
    blocks,
    swings: swingsOf(input, xToPx),
    measured,
    predicted: curve(input.predicted, window.fromUtcMs, window.toUtcMs),
    equilibria: equilibriaOf(input, { xToPx, yToPx }),
    nowX,
    nowDot: nowX === null ? null : newestPoint(measured, nowX),
    rangeRad,
    xToPx,
    pxToX,
    yToPx,
  };
}

/** The newest measured point, if it is near enough to the now-line to be called present. */
function newestPoint(segments: [number, number][][], nowX: number): { x: number; y: number } | null {
  const point = segments.at(-1)?.at(-1);
  return point && Math.abs(point[0] - nowX) < 6 ? { x: nowX, y: point[1] } : null;
}

/** The step under a horizontal position: the one that covers it, else the nearest in time. */
export function stepAt(steps: readonly StripStep[], utcMs: number): StripStep | null {
  const covering = steps.findLast((step) => step.startUtcMs <= utcMs && step.endUtcMs >= utcMs);
  if (covering) return covering;
  const distance = (step: StripStep) => Math.min(Math.abs(step.startUtcMs - utcMs), Math.abs(step.endUtcMs - utcMs));
  return steps.reduce<StripStep | null>((best, step) => (best === null || distance(step) < distance(best) ? step : best), null);
}
