import type { ProtocolDocument } from '../protocol/document';
import type { ClockChoice } from './clock-choice';
import type { EvaluationResult } from './result';

type Registered = NonNullable<ProtocolDocument['evaluation']>;

/** What was done, as far as the person who evaluates may choose it; drift and its order are always the registered ones. */
interface Done {
  method: EvaluationResult['method'];
  /** Null where the channel is not known. */
  channel: string | null;
  /** Absent: as the data tell it. */
  clock?: ClockChoice;
}

/** `left as it is`, `set by 0.350 s`. */
const clockWords = (clock: Exclude<ClockChoice, { kind: 'estimated' }>): string =>
  clock.kind === 'left' ? 'left as it is' : `set by ${String(clock.offset_s)} s`;

/** Each difference between the registered evaluation and the one that was done, in words; empty: as registered. */
export function registeredDifferences(registered: Registered, { method, channel, clock }: Done): string[] {
  const expected = registered.method ?? 'equilibrium';
  return [
    ...(method === expected ? [] : [`method ${method}, registered ${expected}`]),
    ...(registered.channel === undefined || channel === null || channel === registered.channel
      ? []
      : [`channel ${channel}, registered ${registered.channel}`]),
    ...(clock === undefined || clock.kind === 'estimated' ? [] : [`clock of the channel ${clockWords(clock)}, not as the data tell it`]),
  ];
}
