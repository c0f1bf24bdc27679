/** The phone's own clock, and how far it is from the server's. The only place of the web client that reads the time. */

export const deviceNowMs = (): number => Date.now();

export interface ClockOffset {
  /** Server minus phone, ms. */
  offsetMs: number;
  /** Half the round trip of the best exchange so far: how wrong the offset can be, ms. */
  uMs: number;
}

/** An exchange with a shorter round trip bounds the offset better; an old bound is worth less as clocks drift (100 ppm assumed, no source). */
export function betterOffset(before: ClockOffset | null, exchange: { sentMs: number; receivedMs: number; serverMs: number }): ClockOffset {
  const uMs = (exchange.receivedMs - exchange.sentMs) / 2;
  const offsetMs = exchange.serverMs - (exchange.sentMs + uMs);
  return before !== null && before.uMs <= uMs ? before : { offsetMs, uMs };
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
