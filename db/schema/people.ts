import { sql } from 'drizzle-orm';
import { boolean, check, index, pgTable, primaryKey, text, timestamp, uniqueIndex } from 'drizzle-orm/pg-core';
import { roles } from '../../shared/contracts/roles';
import { instant, key } from './columns';
import { labs } from './labs';

export const users = pgTable(
  'users',
  {
    id: key('id')
      .primaryKey()
      .default(sql`gen_random_uuid()`),
    name: text('name').notNull(),
    /** In lower case. */
    email: text('email').notNull(),
    /** argon2id in its encoded form. */
    passwordHash: text('password_hash').notNull(),
    /** A demo account: its password is public, so it signs in only where the server runs in demo mode. */
    demo: boolean('demo').notNull().default(false),
    createdAt: instant('created_at').notNull(),
  },
  (table) => [uniqueIndex('users_email').on(table.email), check('users_email_lower', sql`${table.email} = lower(${table.email})`)],
);

export const memberships = pgTable(
  'memberships',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    userId: key('user_id')
      .notNull()
      .references(() => users.id),
    role: text('role', { enum: roles }).notNull(),
    since: instant('since').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.userId] }),
    index('memberships_user').on(table.userId),
    check('memberships_role', sql`${table.role} in ('owner', 'keeper', 'operator', 'analyst', 'viewer')`),
  ],
);

/** `id` is the SHA-256 of the token in the cookie: whoever reads this table cannot sign in with it. */
export const sessions = pgTable(
  'sessions',
  {
    id: text('id').primaryKey(),
    userId: key('user_id')
      .notNull()
      .references(() => users.id, { onDelete: 'cascade' }),
    /** End of the idle limit, moved on while the session is used. */
    expiresAt: timestamp('expires_at', { withTimezone: true, mode: 'date' }).notNull(),
    /** End of the absolute limit, never moved. */
    endsAt: instant('ends_at').notNull(),
    createdAt: instant('created_at').notNull(),
    authAt: instant('auth_at').notNull(),
    userAgent: text('user_agent').notNull(),
    ip: text('ip').notNull(),
  },
  (table) => [index('sessions_user').on(table.userId), index('sessions_ends').on(table.endsAt)],
);

export const passwordResets = pgTable(
  'password_resets',
  {
    tokenHash: text('token_hash').primaryKey(),
    userId: key('user_id')
      .notNull()
      .references(() => users.id, { onDelete: 'cascade' }),
    createdAt: instant('created_at').notNull(),
    expiresAt: instant('expires_at').notNull(),
    usedAt: instant('used_at'),
  },
  (table) => [index('password_resets_user').on(table.userId)],
);

export const invitations = pgTable(
  'invitations',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    tokenHash: text('token_hash').notNull(),
    email: text('email').notNull(),
    role: text('role', { enum: roles }).notNull(),
    invitedById: key('invited_by_id')
      .notNull()
      .references(() => users.id),
    createdAt: instant('created_at').notNull(),
    expiresAt: instant('expires_at').notNull(),
    acceptedAt: instant('accepted_at'),
    withdrawnAt: instant('withdrawn_at'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    uniqueIndex('invitations_token').on(table.tokenHash),
    check('invitations_role', sql`${table.role} in ('owner', 'keeper', 'operator', 'analyst', 'viewer')`),
  ],
);
