import { deviceNowMs } from '@/components/api/device-clock';

/** When a hold or stop is sent again until it is answered, ms after the tap: quickly at first, then ever more seldom. */
const attemptAtMs: readonly number[] = [0, 300, 800, 1800, 3800, 7800, 15_800, 29_000];
const giveUpAfterMs = 30_000;

/** What an attempt came to: a final answer, or none that counts (no network, server busy, still at work on an earlier attempt). */
export type Attempt<T> = { kind: 'answer'; value: T } | { kind: 'none' };

export interface SendingOptions<T> {
  /** Sends once. Every attempt carries the same idempotency key, so that the server acts at most once. */
  send: (signal: AbortSignal) => Promise<Attempt<T>>;
  onAttempt: () => void;
  onNoAnswer: () => void;
}

export interface Sending<T> {
  /** The first answer, or null when there was none in 30 s. Never rejects. */
  answer: Promise<T | null>;
  /** One more attempt at once, for a second tap; false where this sending is over. */
  again: () => boolean;
  cancel: () => void;
}

/**
 * Sends at the times of {@link attemptAtMs} until one attempt is answered. An attempt that hangs does not keep the next
 * one waiting: on a bad network a fresh connection often gets through where the old one is stuck.
 */
export function sendUntilAnswered<T>({ send, onAttempt, onNoAnswer }: SendingOptions<T>): Sending<T> {
  const abort = new AbortController();
  const timers: ReturnType<typeof setTimeout>[] = [];
  let settle: (value: T | null) => void = () => undefined;
  let over = false;
  const answer = new Promise<T | null>((resolve) => {
    settle = resolve;
  });
  const end = (value: T | null) => {
    if (over) return;
    over = true;
    timers.forEach(clearTimeout);
    abort.abort();
    settle(value);
  };
  const beganMs = deviceNowMs();
  const attempt = () => {
    // A page that was frozen meanwhile wakes with all its timers due: nothing is sent later than it counts.
    if (deviceNowMs() - beganMs >= giveUpAfterMs) end(null);
    if (over) return false;
    onAttempt();
    send(abort.signal).then(
      (outcome) => (outcome.kind === 'answer' ? end(outcome.value) : over ? undefined : onNoAnswer()),
      () => (over ? undefined : onNoAnswer()),
    );
    return true;
  };
  for (const atMs of attemptAtMs) timers.push(setTimeout(attempt, atMs));
  timers.push(setTimeout(() => end(null), giveUpAfterMs));
  return { answer, again: attempt, cancel: () => end(null) };
}
