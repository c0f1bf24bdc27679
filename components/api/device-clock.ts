/** The phone's own clock, and how far it is from the server's. The only place of the web client that reads the time. */

export const deviceNowMs = (): number => Date.now();

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

let offset: ClockOffset | null = null;

/** Learns from an answer that carried the server's time. */
export function observeServerTime(exchange: { sentMs: number; receivedMs: number; serverMs: number }): void {
  offset = betterOffset(offset, exchange);
}

/** The present time by the server's clock, ms UTC; the phone's own until the first exchange. */
export const serverNowMs = (): number => deviceNowMs() + (offset?.offsetMs ?? 0);

/** The present time by the server's clock in ISO 8601, for `tappedAt`. */
export const serverNowIso = (): string => new Date(serverNowMs()).toISOString();
