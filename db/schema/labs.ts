import { sql } from 'drizzle-orm';
import { bigint, json, pgTable, primaryKey, text } from 'drizzle-orm/pg-core';
import { instant, key } from './columns';

export const labs = pgTable('labs', {
  id: key('id')
    .primaryKey()
    .default(sql`gen_random_uuid()`),
  name: text('name').notNull(),
  /** IANA zone. */
  timeZone: text('time_zone').notNull(),
  createdAt: instant('created_at').notNull(),
});

/**
 * The audit chain of each lab, by the rule of the run archive's event chain. Rows are only ever added: a trigger
 * refuses all else. `data` is json and not jsonb, here and in every column that holds a hashed or engine-made value:
 * json keeps the text as written and also takes `\u0000`, which a noisy line may well deliver.
 */
export const audit = pgTable(
  'audit',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    seq: bigint('seq', { mode: 'number' }).notNull(),
    /** ISO 8601 UTC exactly as hashed. */
    at: text('at').notNull(),
    kind: text('kind').notNull(),
    /** Holds `who: {id, name}` and what was done to what. */
    data: json('data').$type<Record<string, unknown>>().notNull(),
    prev: text('prev').notNull(),
    hash: text('hash').notNull(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.seq] })],
);
