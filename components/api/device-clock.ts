/** The phone's own clock, and how far it is from the server's. The only place of the web client that reads the time. */

export const deviceNowMs = (): number => Date.now();

/** Time of this page that nobody sets, ms: what the browser stamps pictures of a camera with. */
export const monotonicMs = (): number => performance.now();

export interface ClockOffset {
  /** Server minus phone, ms. */
  offsetMs: number;
  /** Half the round trip of the best exchange so far: how wrong the offset can be, ms. */
  uMs: number;
}

/** Apart from a step, the offset changes by no more than this between two exchanges, ms (100 ppm over ten minutes: assumed, no source). */
const driftMs = 60;

/** An exchange with a shorter round trip bounds the offset better; one that contradicts the bound tells that a clock was set: the newer holds. */
export function betterOffset(before: ClockOffset | null, exchange: { sentMs: number; receivedMs: number; serverMs: number }): ClockOffset {
  const uMs = (exchange.receivedMs - exchange.sentMs) / 2;
  const offsetMs = exchange.serverMs - (exchange.sentMs + uMs);
  const wasSet = before !== null && Math.abs(offsetMs - before.offsetMs) > uMs + before.uMs + driftMs;
  return before !== null && !wasSet && before.uMs <= uMs ? before : { offsetMs, uMs };
}

/** How late a message of a live stream may be that is taken for the server's time, ms (an estimate, no source). */
const onTheWayMs = 250;

/** A message can only be late: where the server's time is thought to be behind what it says, a clock was set. */
export function offsetAfterMessage(before: ClockOffset | null, message: { receivedMs: number; serverMs: number }): ClockOffset {
  const offsetMs = message.serverMs - message.receivedMs;
  return before !== null && before.offsetMs + before.uMs + driftMs >= offsetMs ? before : { offsetMs, uMs: onTheWayMs };
}

let offset: ClockOffset | null = null;

/** Learns from an answer that carried the server's time. */
export function observeServerTime(exchange: { sentMs: number; receivedMs: number; serverMs: number }): void {
  offset = betterOffset(offset, exchange);
}

/** Learns from a message of a live stream that carried the server's time, ms UTC. */
export function hearServerTime(serverMs: number): void {
  offset = offsetAfterMessage(offset, { receivedMs: deviceNowMs(), serverMs });
}

/** The present time by the server's clock, ms UTC; the phone's own until the first exchange. */
export const serverNowMs = (): number => deviceNowMs() + (offset?.offsetMs ?? 0);

/** The present time by the server's clock in ISO 8601, for `tappedAt`. */
export const serverNowIso = (): string => new Date(serverNowMs()).toISOString();
