import { and, asc, eq, isNull, sql } from 'drizzle-orm';
import { channels, retentionRules, rigs, thinnedStretches } from '@/db/schema';
import type { ChannelRecord } from './imports';
import type { Handle } from './database';

/** How long samples are kept at their full rate, and of which stretches the summaries alone are left. */

export type RetentionRule = typeof retentionRules.$inferSelect;

const dayMs = 24 * 3_600_000;
/** A rule takes hold so long after it was decided: until then nothing is lost by it. */
const graceMs = dayMs;

export const rulesOf = (db: Handle, labId: string): Promise<RetentionRule[]> =>
  db.select().from(retentionRules).where(eq(retentionRules.labId, labId));

export interface Keeping {
  /** Null: for ever. */
  days: number | null;
  /** From when on it is gone by, UTC ms; null where nobody decided anything. */
  holdsFromUtcMs: number | null;
}

/** How long samples of a channel are kept, or those of a channel without a rule of its own (null). */
export function keepingOf(rules: readonly RetentionRule[], channelId: string | null): Keeping {
  const own = rules.find((rule) => rule.channelId === channelId);
  const counts = own === undefined || own.asLab ? rules.find((rule) => rule.channelId === null) : own;
  const decided = [own, counts].flatMap((rule) => (rule === undefined ? [] : [rule.decidedAt]));
  return { days: counts?.keepDays ?? null, holdsFromUtcMs: decided.length === 0 ? null : Math.max(...decided) + graceMs };
}

/** What is older goes by a rule of so many days, UTC ms. */
export const cutoffOf = (days: number, nowUtcMs: number): number => nowUtcMs - days * dayMs;

/** Labs that do not keep everything. */
export async function labsThatThin(db: Handle): Promise<string[]> {
  const thins = sql`${retentionRules.keepDays} is not null`;
  const found = await db.selectDistinct({ labId: retentionRules.labId }).from(retentionRules).where(thins);
  return found.map(({ labId }) => labId);
}

export async function decideRule(db: Handle, rule: RetentionRule): Promise<void> {
  const { asLab, keepDays, decidedAt, decidedBy } = rule;
  await db
    .insert(retentionRules)
    .values(rule)
    .onConflictDoUpdate({ target: [retentionRules.labId, retentionRules.channelId], set: { asLab, keepDays, decidedAt, decidedBy } });
}

/** Channels of the lab's rigs, by rig and name. That of one rehearsal belongs to its run and is always kept. */
export const channelsWithRig = (db: Handle, labId: string): Promise<{ channel: ChannelRecord; rigName: string }[]> =>
  db
    .select({ channel: channels, rigName: rigs.name })
    .from(channels)
    .innerJoin(rigs, and(eq(rigs.labId, channels.labId), eq(rigs.id, channels.rigId)))
    .where(and(eq(channels.labId, labId), isNull(channels.runId)))
    .orderBy(asc(rigs.name), asc(channels.name));

export interface Thinned {
  /** Samples that were taken away. */
  samples: number;
  fromUtcMs: number;
  toUtcMs: number;
}

/** Of each channel of the lab that was thinned: how much, from when to when. */
export async function thinnedOfLab(db: Handle, labId: string): Promise<Map<string, Thinned>> {
  const { channelId, samples, fromAt, toAt } = thinnedStretches;
  const rows = await db
    .select({
      channelId,
      samples: sql<number>`sum(${samples})::double precision`,
      fromUtcMs: sql<number>`(extract(epoch from min(${fromAt})) * 1000)::double precision`,
      toUtcMs: sql<number>`(extract(epoch from max(${toAt})) * 1000)::double precision`,
    })
    .from(thinnedStretches)
    .where(eq(thinnedStretches.labId, labId))
    .groupBy(channelId);
  return new Map(rows.map(({ channelId: id, ...thinned }) => [id, thinned]));
}

/** Stretches within a window of which summaries alone are left, in order of time, as one where they follow each other. */
export async function thinnedWithin(
  db: Handle,
  window: { labId: string; channelId: string; fromUtcMs: number; toUtcMs: number },
): Promise<Thinned[]> {
  const { labId, channelId, fromAt, toAt, samples } = thinnedStretches;
  const rows = await db
    .select({ fromUtcMs: fromAt, toUtcMs: toAt, samples })
    .from(thinnedStretches)
    .where(and(eq(labId, window.labId), eq(channelId, window.channelId)))
    .orderBy(asc(fromAt));
  const joined: Thinned[] = [];
  for (const row of rows) {
    if (row.fromUtcMs > window.toUtcMs || row.toUtcMs <= window.fromUtcMs) continue;
    const last = joined.at(-1);
    if (last?.toUtcMs !== row.fromUtcMs) joined.push(row);
    else joined.splice(-1, 1, { ...last, toUtcMs: row.toUtcMs, samples: last.samples + row.samples });
  }
  return joined;
}
