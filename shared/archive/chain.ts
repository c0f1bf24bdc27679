import canonicalize from 'canonicalize';
import type { ChainedEvent } from './run-records';

/** SHA-256 of a text (as UTF-8) in lower-case hex. */
export type Sha256 = (text: string) => string;

/** Where a chain stands: number and hash of its last event. Any event of the chain is one. */
export interface ChainHead {
  seq: number;
  hash: string;
}

export interface NewEvent {
  /** ISO 8601 UTC with milliseconds. */
  at: string;
  kind: string;
  /** Plain JSON; no undefined, NaN or infinity. */
  data: Record<string, unknown>;
}

/** The head of a chain without events: the first `prev` is 64 zeros. */
export const emptyChain: ChainHead = { seq: 0, hash: '0'.repeat(64) };

/** The RFC 8785 canonical JSON text of a value. */
export function canonicalJson(value: unknown): string {
  const text = canonicalize(value);
  if (text === undefined) throw new Error('there is no canonical JSON of undefined');
  return text;
}

/** The event that follows `head` in the chain, with its hash. The caller stores it and goes on from it. */
export function appendEvent(head: ChainHead, event: NewEvent, sha256: Sha256): ChainedEvent {
  const unhashed = { seq: head.seq + 1, at: event.at, kind: event.kind, data: event.data, prev: head.hash };
  return { ...unhashed, hash: sha256(canonicalJson(unhashed)) };
}

export type ChainCheck = { valid: true; events: number; head: ChainHead } | { valid: false; seq: number; why: string };

/** Follows a chain from its first event, or from the one after a head that was verified before, and says at which `seq` it breaks, if it does. */
export function verifyChain(events: Iterable<ChainedEvent>, sha256: Sha256, from: ChainHead = emptyChain): ChainCheck {
  let head = from;
  for (const event of events) {
    const expectedSeq = head.seq + 1;
    if (event.seq !== expectedSeq)
      return { valid: false, seq: expectedSeq, why: `event ${expectedSeq} is missing: seq ${String(event.seq)} stands in its place` };
    if (event.prev !== head.hash)
      return {
        valid: false,
        seq: event.seq,
        why: `event ${event.seq} does not follow from the event before it: prev is not that event's hash`,
      };
    if (hashOf(event, sha256) !== event.hash)
      return { valid: false, seq: event.seq, why: `event ${event.seq} was changed: its hash does not match its content` };
    head = { seq: event.seq, hash: event.hash };
  }
  return { valid: true, events: head.seq, head };
}

/** What the hash of an event must be; null where its content has no canonical JSON (a number beyond all doubles) and so cannot have one. */
function hashOf(event: ChainedEvent, sha256: Sha256): string | null {
  try {
    // What is undefined has no place in canonical JSON.
    return sha256(canonicalJson({ ...event, hash: undefined }));
  } catch {
    return null;
  }
}
