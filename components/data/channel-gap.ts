import type { ChannelView } from '@/shared/contracts/data';

/** Beyond so many of its own intervals, and a minute, a channel is said to be silent. */
const silentIntervals = 3;
const silentMs = 60_000;

/** How long a channel may say nothing before it is silent, ms. */
export const silentAfterMs = ({ rateHz }: Pick<ChannelView, 'rateHz'>): number =>
  Math.max(silentMs, rateHz === null ? 0 : (1000 * silentIntervals) / rateHz);

/** A longer step is drawn as a gap, ms: what is drawn may be thinned to least and greatest of `points` / 2 intervals. */
export function drawnGapMs(channel: Pick<ChannelView, 'rateHz'>, utcMs: readonly number[], points: number): number {
  const spanMs = (utcMs.at(-1) ?? 0) - (utcMs[0] ?? 0);
  return Math.max(silentAfterMs(channel), (4 * spanMs) / points);
}
