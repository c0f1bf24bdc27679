import type { Clock } from '@/server/interfaces/clock';

/** Waits for something, but no longer than this. */
export async function atMost(longestMs: number, awaited: Promise<unknown>, clock: Clock): Promise<void> {
  let cancel = () => undefined as void;
  const longest = new Promise<void>((resolve) => {
    cancel = clock.after(longestMs, resolve);
  });
  await Promise.race([awaited, longest]);
  cancel();
}

const longestKeepingMs = 1_000;

/** Before an answer, what it tells of is safe on a disk, so that it cannot be forgotten; a disk that takes longer keeps nobody waiting. */
export const safeOnDisk = (kept: Promise<unknown>, clock: Clock): Promise<void> => atMost(longestKeepingMs, kept, clock);
