/** Answers of commands, kept so that a repeat with the same `Idempotency-Key` returns the first answer and acts once. */
export interface IdempotencyPort {
  /** Claims the key for this request, or tells what became of it before. */
  begin(claim: IdempotencyClaim): Promise<IdempotencyState>;
  /** Keeps the answer of a claimed key. */
  finish(claim: IdempotencyClaim, answer: IdempotencyAnswer): Promise<void>;
  /** Gives a claimed key back, so that a repeat is tried anew (the request came to no answer of its own). */
  release(claim: IdempotencyClaim): Promise<void>;
}

export interface IdempotencyClaim {
  userId: string;
  key: string;
  /** SHA-256 (hex) over method, path, preconditions and body: the same key with another one is refused. */
  fingerprint: string;
}

export interface IdempotencyAnswer {
  status: number;
  /** JSON of the answer; null for an answer without a body. */
  body: unknown;
  etag: string | null;
}

export type IdempotencyState =
  { kind: 'new' } | { kind: 'running' } | { kind: 'other-request' } | { kind: 'answered'; answer: IdempotencyAnswer };
