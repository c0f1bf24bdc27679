import { sql } from 'drizzle-orm';
import { index, integer, json, pgTable, primaryKey, text } from 'drizzle-orm/pg-core';
import { instant, key } from './columns';
import { labs } from './labs';
import { users } from './people';

/** Work to be done after the transaction that asks for it; taken with a lease, so that a dead worker's job comes back. */
export const jobs = pgTable(
  'jobs',
  {
    id: key('id')
      .primaryKey()
      .default(sql`gen_random_uuid()`),
    /** Null for work of no lab, a password reset mail for example. */
    labId: key('lab_id').references(() => labs.id),
    kind: text('kind').notNull(),
    payload: json('payload').$type<unknown>().notNull(),
    state: text('state', { enum: ['waiting', 'running', 'done', 'given-up'] })
      .notNull()
      .default('waiting'),
    attempts: integer('attempts').notNull().default(0),
    maxAttempts: integer('max_attempts').notNull(),
    /** Not before this instant. */
    dueAt: instant('due_at').notNull(),
    leaseUntil: instant('lease_until'),
    holder: text('holder'),
    lastError: text('last_error'),
    createdAt: instant('created_at').notNull(),
    finishedAt: instant('finished_at'),
  },
  (table) => [
    index('jobs_open')
      .on(table.dueAt)
      .where(sql`${table.state} in ('waiting', 'running')`),
  ],
);

/** The first answer to each command, so that a repeat gets it again and acts no second time. */
export const idempotencyKeys = pgTable(
  'idempotency_keys',
  {
    userId: key('user_id')
      .notNull()
      .references(() => users.id, { onDelete: 'cascade' }),
    key: text('key').notNull(),
    /** SHA-256 (hex) of method, path, preconditions and body. */
    fingerprint: text('fingerprint').notNull(),
    /** Null while the first is still at work. */
    status: integer('status'),
    body: json('body').$type<unknown>(),
    etag: text('etag'),
    claimedAt: instant('claimed_at').notNull(),
    expiresAt: instant('expires_at').notNull(),
  },
  (table) => [primaryKey({ columns: [table.userId, table.key] }), index('idempotency_keys_expiry').on(table.expiresAt)],
);

/** Counters of what is rationed, for example sign-in attempts on one address. */
export const rateLimits = pgTable(
  'rate_limits',
  {
    bucket: text('bucket').primaryKey(),
    windowStartAt: instant('window_start_at').notNull(),
    windowEndAt: instant('window_end_at').notNull(),
    count: integer('count').notNull(),
  },
  (table) => [index('rate_limits_end').on(table.windowEndAt)],
);
