import { and, desc, eq, lt, sql } from 'drizzle-orm';
import { audit } from '@/db/schema';
import { appendEvent, emptyChain, type Sha256 } from '@/shared/archive/chain';
import type { Handle, Transaction } from './database';

/** Who did it: an account, or the server itself. */
export interface Actor {
  /** Account; null for the server. */
  id: string | null;
  name: string;
}

export interface AuditFact {
  labId: string;
  who: Actor;
  /** What was done, for example `member.role-changed`. */
  kind: string;
  /** To what: ids and values before and after, never a secret and no address of a person. */
  data: Record<string, unknown>;
  utcMs: number;
}

export type AuditRow = typeof audit.$inferSelect;

/**
 * Adds an entry to the lab's audit chain, in the transaction of the act itself: an act that cannot be audited does not
 * happen. Entries are numbered without gaps, for an advisory lock lets one writer of a lab at a time to the chain's end.
 */
export async function appendAudit(tx: Transaction, fact: AuditFact, sha256: Sha256): Promise<void> {
  const { labId } = fact;
  await tx.execute(sql`select pg_advisory_xact_lock(hashtextextended(${`audit ${labId}`}, 0))`);
  const [last] = await tx
    .select({ seq: audit.seq, hash: audit.hash })
    .from(audit)
    .where(eq(audit.labId, labId))
    .orderBy(desc(audit.seq))
    .limit(1);
  // Through JSON once, so that what is hashed is what the column gives back.
  const data = JSON.parse(JSON.stringify({ ...fact.data, who: fact.who })) as Record<string, unknown>;
  await tx
    .insert(audit)
    .values({ labId, ...appendEvent(last ?? emptyChain, { at: new Date(fact.utcMs).toISOString(), kind: fact.kind, data }, sha256) });
}

/** Entries of a lab, newest first, from before `beforeSeq` on. */
export function auditPage(db: Handle, page: { labId: string; beforeSeq: number | null; limit: number }): Promise<AuditRow[]> {
  const own = eq(audit.labId, page.labId);
  return db
    .select()
    .from(audit)
    .where(page.beforeSeq === null ? own : and(own, lt(audit.seq, page.beforeSeq)))
    .orderBy(desc(audit.seq))
    .limit(page.limit);
}
