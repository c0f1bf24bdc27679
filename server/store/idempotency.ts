import { and, eq, isNull, lte, or, sql } from 'drizzle-orm';
import { idempotencyKeys } from '@/db/schema';
import type { IdempotencyClaim, IdempotencyPort, IdempotencyState } from '../interfaces/idempotency';
import type { Database } from './database';

/** How long a first answer is kept (the expiry the draft RFC leaves to the server). */
const keptMs = 24 * 3_600_000;
/** A claim without an answer after this long belongs to a process that died. */
const claimMs = 60_000;

/** Idempotency keys in the database: shared by all processes, kept for 24 h. */
export function createIdempotency(db: Database, nowUtcMs: () => number): IdempotencyPort {
  const own = (claim: IdempotencyClaim) => and(eq(idempotencyKeys.userId, claim.userId), eq(idempotencyKeys.key, claim.key));
  return {
    begin: (claim) => begin(db, claim, nowUtcMs()),
    finish: async (claim, answer) => {
      await db
        .update(idempotencyKeys)
        .set({ status: answer.status, body: answer.body, etag: answer.etag })
        .where(and(own(claim), eq(idempotencyKeys.fingerprint, claim.fingerprint)));
    },
    release: async (claim) => {
      await db
        .delete(idempotencyKeys)
        .where(and(own(claim), eq(idempotencyKeys.fingerprint, claim.fingerprint), isNull(idempotencyKeys.status)));
    },
  };
}

async function begin(db: Database, claim: IdempotencyClaim, nowUtcMs: number): Promise<IdempotencyState> {
  const fresh = { ...claim, status: null, body: null, etag: null, claimedAt: nowUtcMs, expiresAt: nowUtcMs + keptMs };
  const staleClaim = and(
    isNull(idempotencyKeys.status),
    lte(idempotencyKeys.claimedAt, nowUtcMs - claimMs),
    eq(idempotencyKeys.fingerprint, claim.fingerprint),
  );
  // One statement claims a free, an expired or an abandoned key; of two that race only one gets a row back.
  const claimed = await db
    .insert(idempotencyKeys)
    .values(fresh)
    .onConflictDoUpdate({
      target: [idempotencyKeys.userId, idempotencyKeys.key],
      set: fresh,
      setWhere: or(lte(idempotencyKeys.expiresAt, nowUtcMs), staleClaim) ?? sql`false`,
    })
    .returning({ key: idempotencyKeys.key });
  if (claimed.length === 1) return { kind: 'new' };
  const [row] = await db
    .select()
    .from(idempotencyKeys)
    .where(and(eq(idempotencyKeys.userId, claim.userId), eq(idempotencyKeys.key, claim.key)));
  // Released between the two statements: the first request is over and left no answer, so the caller may ask again.
  if (row === undefined) return { kind: 'running' };
  if (row.fingerprint !== claim.fingerprint) return { kind: 'other-request' };
  return row.status === null ? { kind: 'running' } : { kind: 'answered', answer: { status: row.status, body: row.body, etag: row.etag } };
}

/** Removes keys past their 24 h; returns how many. */
export async function sweepIdempotencyKeys(db: Database, nowUtcMs: number): Promise<number> {
  const gone = await db.delete(idempotencyKeys).where(lte(idempotencyKeys.expiresAt, nowUtcMs));
  return gone.rowCount ?? 0;
}
