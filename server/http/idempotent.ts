import canonicalize from 'canonicalize';
import type { IdempotencyAnswer, IdempotencyClaim, IdempotencyPort, IdempotencyState } from '../interfaces/idempotency';
import { ProblemError, problemOf } from './problem-error';

/** Reads an `Idempotency-Key` (draft-ietf-httpapi-idempotency-key-header-07: a quoted string; bare text is taken too). */
export function idempotencyKeyOf(header: string | undefined): string {
  const key = header?.replace(/^"(.*)"$/, '$1') ?? '';
  if (!/^[\x21-\x7e]{1,128}$/.test(key))
    throw new ProblemError(
      'invalid-input',
      'A command needs the header Idempotency-Key: 1 to 128 visible characters, new for each command and the same for each repeat of it.',
    );
  return key;
}

/** What makes two requests the same: route, address, named version and body. */
export function fingerprintOf(
  request: { method: string; path: string; ifMatch: string | null; body: unknown },
  sha256: (text: string) => string,
): string {
  return sha256(canonicalize({ ...request, body: request.body ?? null }) ?? '');
}

/**
 * Acts once for a key. A repeat gets the first answer, problems that were decided included; a failure on our side
 * gives the key back.
 */
export async function actOnce(
  port: IdempotencyPort,
  claim: IdempotencyClaim,
  act: () => Promise<IdempotencyAnswer>,
): Promise<IdempotencyAnswer> {
  const state = await port.begin(claim);
  if (state.kind === 'answered') return state.answer;
  if (state.kind === 'running')
    throw new ProblemError(
      'still-running',
      'The first request with this Idempotency-Key has not been answered yet. Ask again in a second with the same key.',
    );
  if (state.kind === 'other-request')
    throw new ProblemError('key-reused', 'This Idempotency-Key was used for another request. Each command needs a key of its own.');
  try {
    const answer = await act();
    await port.finish(claim, answer);
    return answer;
  } catch (error) {
    if (error instanceof ProblemError && isDecided(error)) {
      const problem = problemOf(error, '');
      await port.finish(claim, {
        status: problem.status,
        body: { code: error.code, detail: error.detail, errors: error.errors ?? null },
        etag: null,
      });
    } else {
      await port.release(claim);
    }
    throw error;
  }
}

const isDecided = (error: ProblemError) =>
  !['internal', 'database-away', 'rigs-away', 'too-many-requests', 'still-running'].includes(error.code);

/** A kept problem, thrown again for a repeat. */
export function rethrowKeptProblem(answer: IdempotencyAnswer): void {
  if (answer.status < 400) return;
  const kept = answer.body as Pick<ProblemError, 'code' | 'detail'> & { errors: ProblemError['errors'] | null };
  throw new ProblemError(kept.code, kept.detail, kept.errors ?? undefined);
}

/**
 * Keys of hold, stop and personal locks, in memory: these must not wait for a table that may be unreachable. A repeat that comes to another
 * process is known to the run (`actedOn` of its snapshot), and a person has one lock on a rig however often it is set.
 */
export class MemoryIdempotency implements IdempotencyPort {
  private readonly kept = new Map<string, { fingerprint: string; answer: IdempotencyAnswer | null }>();

  constructor(private readonly capacity = 5000) {}

  begin(claim: IdempotencyClaim): Promise<IdempotencyState> {
    const found = this.kept.get(keyOf(claim));
    if (found === undefined) {
      const oldest = this.kept.size >= this.capacity ? this.kept.keys().next().value : undefined;
      if (oldest !== undefined) this.kept.delete(oldest);
      this.kept.set(keyOf(claim), { fingerprint: claim.fingerprint, answer: null });
      return Promise.resolve({ kind: 'new' });
    }
    if (found.fingerprint !== claim.fingerprint) return Promise.resolve({ kind: 'other-request' });
    return Promise.resolve(found.answer === null ? { kind: 'running' } : { kind: 'answered', answer: found.answer });
  }

  finish(claim: IdempotencyClaim, answer: IdempotencyAnswer): Promise<void> {
    this.kept.set(keyOf(claim), { fingerprint: claim.fingerprint, answer });
    return Promise.resolve();
  }

  release(claim: IdempotencyClaim): Promise<void> {
    this.kept.delete(keyOf(claim));
    return Promise.resolve();
  }
}

const keyOf = (claim: IdempotencyClaim) => `${claim.userId} ${claim.key}`;
