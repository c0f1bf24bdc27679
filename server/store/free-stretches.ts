import { bucketUs, joinStretches, type Stretch } from './sample-levels';

/** Which stretches of a channel may be thinned to their summaries; pure. */

/** What a run needs begins so long before it and ends so long after it, µs: for its clock, and for what the room did (no source). */
export const marginUs = 3_600_000_000;

/** What is left of `whole` without `kept`, in order, in whole buckets of level 0: those that `kept` touches stay with it. */
export function freeStretches(whole: Stretch, kept: readonly Stretch[]): Stretch[] {
  const free: Stretch[] = [];
  let fromUs = bucketFrom(whole.fromUs);
  const end = bucketUpTo(whole.toUs);
  for (const stretch of joinStretches(kept, 0)) {
    free.push({ fromUs, toUs: Math.min(end, bucketUpTo(stretch.fromUs)) });
    fromUs = Math.max(fromUs, bucketFrom(stretch.toUs));
  }
  free.push({ fromUs, toUs: end });
  return free.filter((stretch) => stretch.fromUs < stretch.toUs);
}

/** The first bucket that begins there or later; the last that begins there or before. */
const bucketFrom = (us: number) => Math.ceil(us / bucketUs) * bucketUs;
const bucketUpTo = (us: number) => Math.floor(us / bucketUs) * bucketUs;
