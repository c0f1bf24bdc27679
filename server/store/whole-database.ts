import { isNull, lt, sql } from 'drizzle-orm';
import { arms, schedules } from '@/db/schema';
import type { Sha256 } from '@/shared/archive/chain';
import { appendAudit } from './audit';
import type { Database, Handle } from './database';

/** What backup and restore have to know of the database as a whole. */

/** Every table with its number of rows, partitions as the one table they are. */
export async function tablesOf(db: Handle): Promise<[table: string, rows: number][]> {
  const found = await db.execute<{ name: string }>(
    sql`select c.relname as name from pg_class c join pg_namespace n on n.oid = c.relnamespace
        where n.nspname = 'public' and c.relkind in ('r', 'p') and not c.relispartition order by c.relname`,
  );
  const counts: [string, number][] = [];
  for (const { name } of found.rows) {
    const count = await db.execute<{ count: number }>(sql`select count(*)::double precision as count from ${sql.identifier(name)}`);
    counts.push([name, count.rows[0]?.count ?? 0]);
  }
  return counts;
}

/** Sessions on this database besides the one that asks. */
export async function otherConnections(db: Handle): Promise<number> {
  const found = await db.execute<{ count: number }>(
    sql`select count(*)::int as count from pg_stat_activity
        where datname = current_database() and pid <> pg_backend_pid() and backend_type = 'client backend'`,
  );
  return found.rows[0]?.count ?? 0;
}

/** Throws away everything: tables, functions, the list of migrations. */
export async function wipe(db: Handle): Promise<void> {
  await db.execute(sql`drop schema if exists public cascade`);
  await db.execute(sql`drop schema if exists drizzle cascade`);
  await db.execute(sql`create schema public`);
}

const PUT_BACK = 'a backup was put back';

/**
 * What was given for a time that is gone: every arm of a restored database is ended, with an entry in the audit chain, and no start of before now is
 * told to be missed. `tables`: those that the backup has, which an older version may have made. Returns how many arms were ended.
 */
export function endWhatIsGone(
  db: Database,
  { tables, nowUtcMs, sha256 }: { tables: ReadonlySet<string>; nowUtcMs: number; sha256: Sha256 },
): Promise<number> {
  return db.transaction(async (tx) => {
    const ended = await tx
      .update(arms)
      .set({ endedAt: nowUtcMs, endedWhy: PUT_BACK })
      .where(isNull(arms.endedAt))
      .returning({ labId: arms.labId, rigId: arms.rigId });
    for (const { labId, rigId } of ended) {
      const fact = {
        labId,
        who: { id: null, name: 'the restore' },
        kind: 'rig.arm-ended',
        data: { rigId, why: PUT_BACK },
        utcMs: nowUtcMs,
      };
      await appendAudit(tx, fact, sha256);
    }
    if (tables.has('schedules')) await tx.update(schedules).set({ decidedUntilAt: nowUtcMs }).where(lt(schedules.decidedUntilAt, nowUtcMs));
    return ended.length;
  });
}
