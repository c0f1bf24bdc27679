import { and, asc, desc, eq, gt, like, lt, or, sql } from 'drizzle-orm';
import { audit, labs } from '@/db/schema';
import { appendEvent, emptyChain, type ChainHead, type Sha256 } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import type { Handle } from './database';

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
export async function appendAudit(tx: Handle, fact: AuditFact, sha256: Sha256): Promise<void> {
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

/** Entries of a lab in the order of the chain, `limit` of them from after `afterSeq` on, as links of the chain. */
export async function auditLinks(db: Handle, page: { labId: string; afterSeq: number; limit: number }): Promise<ChainedEvent[]> {
  const { seq, at, kind, data, prev, hash } = audit;
  return db
    .select({ seq, at, kind, data, prev, hash })
    .from(audit)
    .where(and(eq(audit.labId, page.labId), gt(audit.seq, page.afterSeq)))
    .orderBy(asc(audit.seq))
    .limit(page.limit);
}

/** Every lab by name, and where its audit chain ends; the head of a lab without entries is that of an empty chain. */
export async function auditHeads(db: Handle): Promise<{ labId: string; name: string; head: ChainHead }[]> {
  const heads = db
    .selectDistinctOn([audit.labId], { labId: audit.labId, seq: audit.seq, hash: audit.hash })
    .from(audit)
    .orderBy(audit.labId, desc(audit.seq))
    .as('heads');
  const rows = await db
    .select({ labId: labs.id, name: labs.name, seq: heads.seq, hash: heads.hash })
    .from(labs)
    .leftJoin(heads, eq(heads.labId, labs.id))
    .orderBy(asc(labs.name), asc(labs.id));
  return rows.map(({ labId, name, seq, hash }) => ({ labId, name, head: seq === null || hash === null ? emptyChain : { seq, hash } }));
}

export interface AuditPage {
  labId: string;
  beforeSeq: number | null;
  limit: number;
  /** Account; null for the server itself. */
  whoId?: string | null | undefined;
  /** One kind, or the part before its point. */
  kind?: string | undefined;
  fromUtcMs?: number | undefined;
  /** Exclusive. */
  untilUtcMs?: number | undefined;
}

/** Entries of a lab, newest first, from before `beforeSeq` on. */
export function auditPage(db: Handle, { labId, beforeSeq, limit, whoId, kind, fromUtcMs, untilUtcMs }: AuditPage): Promise<AuditRow[]> {
  const at = sql`${audit.at} collate "C"`;
  return db
    .select()
    .from(audit)
    .where(
      and(
        eq(audit.labId, labId),
        beforeSeq === null ? undefined : lt(audit.seq, beforeSeq),
        kind === undefined ? undefined : or(eq(audit.kind, kind), like(audit.kind, `${kind}.%`)),
        // By its text, for a value of JSON may hold what no text of PostgreSQL can. Within a string its quotes would be escaped.
        whoId === undefined ? undefined : sql`${audit.data}::text like ${`%"who":{"id":${JSON.stringify(whoId)},"name":%`}`,
        fromUtcMs === undefined ? undefined : sql`${at} >= ${new Date(fromUtcMs).toISOString()}`,
        untilUtcMs === undefined ? undefined : sql`${at} < ${new Date(untilUtcMs).toISOString()}`,
      ),
    )
    .orderBy(desc(audit.seq))
    .limit(limit);
}
