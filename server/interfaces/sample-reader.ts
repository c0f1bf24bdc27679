import type { Series } from '@/shared/conditions/series';

/** What was measured lately on one rig; answers from memory, at once. */
export interface SampleReader {
  /** Name of the channel with the deflection: the one asked for where it is there, else the only one with that role; null without any. */
  deflection(wanted: string | undefined): string | null;
  /** The samples of a channel of the rig from an instant to another; null where nothing ever came into such a channel. */
  read(channel: string, window: { fromUtcMs: number; toUtcMs: number }): Series | null;
}
