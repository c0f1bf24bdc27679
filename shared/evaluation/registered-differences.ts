import type { ProtocolDocument } from '../protocol/document';
import type { EvaluationResult } from './result';

type Registered = NonNullable<ProtocolDocument['evaluation']>;

/** What was done, as far as the person who evaluates may choose it; drift and its order are always the registered ones. */
interface Done {
  method: EvaluationResult['method'];
  /** Null where the channel is not known. */
  channel: string | null;
}

/** Each difference between the registered evaluation and the one that was done, in words; empty: as registered. */
export function registeredDifferences(registered: Registered, { method, channel }: Done): string[] {
  const expected = registered.method ?? 'equilibrium';
  return [
    ...(method === expected ? [] : [`method ${method}, registered ${expected}`]),
    ...(registered.channel === undefined || channel === null || channel === registered.channel
      ? []
      : [`channel ${channel}, registered ${registered.channel}`]),
  ];
}
