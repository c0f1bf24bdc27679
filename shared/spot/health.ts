import { robustScale } from '../statistics/robust';
import type { SpotReading } from './read-spot';

/** How the reading goes: rate, lost pictures, noise. */

export interface SeenFrame {
  /** When it was taken, monotonic ms. */
  capturedMs: number;
  /** Pictures of the camera since the one before that were never seen here. */
  missed: number;
  reading: SpotReading;
  saturated: number;
  brightest: number;
}

export interface SpotHealth {
  /** The last ones, oldest first. */
  recent: readonly SeenFrame[];
  /** Since the camera was opened. */
  frames: number;
  missed: number;
  unread: number;
  /** The greatest rate that was reached, Hz. */
  bestRateHz: number;
}

export interface SpotFigures {
  /** Pictures a second over the last ones; 0 where none came for two seconds. */
  rateHz: number;
  /** Scatter of the position from picture to picture, px; null until enough were read. Slow motion is no part of it. */
  noisePx: number | null;
  /** What the noise of the pictures explains of it: root mean square of the stated u, px. */
  uPx: number | null;
}

const KEPT = 64;
const SILENT_MS = 2000;
/** Fewer than this tell no noise. */
const FEWEST_TRIPLES = 10;

export const noFrames: SpotHealth = { recent: [], frames: 0, missed: 0, unread: 0, bestRateHz: 0 };

export function healthAfter(health: SpotHealth, frame: SeenFrame): SpotHealth {
  const recent = [...health.recent.slice(1 - KEPT), frame];
  return {
    recent,
    frames: health.frames + 1,
    missed: health.missed + frame.missed,
    unread: health.unread + (frame.reading.kind === 'none' ? 1 : 0),
    bestRateHz: recent.length < KEPT ? health.bestRateHz : Math.max(health.bestRateHz, rateOf(recent)),
  };
}

function rateOf(recent: readonly SeenFrame[]): number {
  const first = recent[0];
  const last = recent.at(-1);
  if (first === undefined || last === undefined || !(last.capturedMs > first.capturedMs)) return 0;
  return ((recent.length - 1) * 1000) / (last.capturedMs - first.capturedMs);
}

export function figuresOf({ recent }: SpotHealth, nowMs: number): SpotFigures {
  const silent = nowMs - (recent.at(-1)?.capturedMs ?? -Infinity) > SILENT_MS;
  const read = recent.flatMap(({ reading }) => (reading.kind === 'spot' ? [reading] : []));
  const uPx = read.length === 0 ? null : Math.sqrt(read.reduce((sum, { uPx: u }) => sum + u * u, 0) / read.length);
  return { rateHz: silent ? 0 : rateOf(recent), noisePx: noiseOf(recent), uPx };
}

/**
 * Second differences of three pictures in a row: a constant velocity is no part of them, and their variance is six times that of one. By their median,
 * so that single knocks are no part of it either.
 */
function noiseOf(recent: readonly SeenFrame[]): number | null {
  const differences: number[] = [];
  for (let i = 2; i < recent.length; i += 1) {
    const [a, b, c] = [recent[i - 2], recent[i - 1], recent[i]].map((frame) => frame?.reading);
    if (a?.kind !== 'spot' || b?.kind !== 'spot' || c?.kind !== 'spot') continue;
    differences.push(a.px - 2 * b.px + c.px);
  }
  return differences.length < FEWEST_TRIPLES ? null : robustScale(Float64Array.from(differences)) / Math.sqrt(6);
}

/** Mean position of the last pictures, px; null where the last one showed no spot. */
export function meanPxOf({ recent }: SpotHealth): number | null {
  if (recent.at(-1)?.reading.kind !== 'spot') return null;
  const read = recent.flatMap(({ reading }) => (reading.kind === 'spot' ? [reading.px] : []));
  return read.reduce((sum, px) => sum + px, 0) / read.length;
}
