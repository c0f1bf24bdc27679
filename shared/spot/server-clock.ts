/**
 * The server's UTC on the device's monotonic time, which no one sets. Each exchange bounds it by half its round trip; what is known grows old as the
 * device's crystal drifts.
 */
export interface ServerClock {
  /** Server's UTC minus monotonic time, ms. */
  aheadMs: number;
  /** How wrong that can have been when it was found, ms. */
  uMs: number;
  /** Monotonic time when it was found, ms. */
  atMs: number;
}

/** Of a crystal, ms a ms (100 ppm: common practice, no source). */
const DRIFT = 1e-4;
/** The server's stamp is in whole ms. */
const STAMP_MS = 0.5;

export const clockUMs = ({ uMs, atMs }: ServerClock, nowMs: number): number => uMs + DRIFT * Math.max(0, nowMs - atMs);

/** An exchange that bounds the clock better than what is known by now, or contradicts it because a clock was set, takes its place. */
export function afterExchange(
  before: ServerClock | null,
  { sentMs, receivedMs, serverMs }: { sentMs: number; receivedMs: number; serverMs: number },
): ServerClock {
  const half = (receivedMs - sentMs) / 2;
  const found = { aheadMs: serverMs - (sentMs + half), uMs: half + STAMP_MS, atMs: receivedMs };
  if (before === null) return found;
  const oldUMs = clockUMs(before, receivedMs);
  const contradicts = Math.abs(found.aheadMs - before.aheadMs) > found.uMs + oldUMs;
  return contradicts || found.uMs <= oldUMs ? found : before;
}

export const utcMsAt = ({ aheadMs }: ServerClock, monotonicMs: number): number => monotonicMs + aheadMs;
