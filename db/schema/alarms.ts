import { sql } from 'drizzle-orm';
import {
  bigserial,
  boolean,
  doublePrecision,
  foreignKey,
  index,
  integer,
  json,
  pgTable,
  primaryKey,
  text,
  uniqueIndex,
} from 'drizzle-orm/pg-core';
import type { AlarmSnapshot } from '../../shared/alarms/machine';
import type { ChannelLimit } from '../../shared/alarms/limits';
import type { CallSettings, OwnCall } from '../../shared/alarms/settings';
import { instant, key } from './columns';
import { channels } from './data';
import { labs } from './labs';
import { users } from './people';
import { rigs } from './rigs';

/** One row for each condition at each place that was ever met: where its machine stands now. */
export const alarms = pgTable(
  'alarms',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    code: text('code').notNull(),
    /** Null: of the whole lab. */
    rigId: key('rig_id'),
    /** What on the rig or in the lab, for example the id of a limit; empty where there is only one. */
    subject: text('subject').notNull().default(''),
    /** What was found, in a sentence, when it was last met. */
    words: text('words').notNull().default(''),
    rings: text('rings', { enum: ['always', 'allowed', 'morning', 'never'] }).notNull(),
    /** Where it is not that of the kind: how long the condition must stand, s. */
    onDelayS: doublePrecision('on_delay_s'),
    /** As people are shown it, also in `snapshot`. */
    state: text('state').notNull(),
    snapshot: json('snapshot').$type<AlarmSnapshot>().notNull(),
    raisedAt: instant('raised_at'),
    /** When something happens by itself; null: nothing will. */
    dueAt: instant('due_at'),
    /** The alarm it follows from; null where it is a first cause. */
    causeId: key('cause_id'),
    runId: key('run_id'),
    /** When what can wait was told; null: not yet. */
    toldAt: instant('told_at'),
    changedAt: instant('changed_at').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    uniqueIndex('alarms_place').on(table.labId, table.code, sql`coalesce(${table.rigId}::text, '')`, table.subject),
    index('alarms_due')
      .on(table.dueAt)
      .where(sql`${table.dueAt} is not null`),
    index('alarms_standing')
      .on(table.labId)
      .where(sql`${table.state} <> 'normal'`),
  ],
);

/** Everything that happened to alarms, in order. */
export const alarmHistory = pgTable(
  'alarm_history',
  {
    labId: key('lab_id').notNull(),
    seq: bigserial('seq', { mode: 'number' }).notNull(),
    alarmId: key('alarm_id').notNull(),
    at: instant('at').notNull(),
    /** A fact of the machine, for example `raised`. */
    fact: text('fact').notNull(),
    occurrence: integer('occurrence').notNull(),
    /** Who did it; empty where it happened by itself. */
    by: text('by').notNull().default(''),
    words: text('words').notNull().default(''),
    /** The run that it concerns, where the condition belongs to one. */
    runId: key('run_id'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.seq] }),
    foreignKey({ columns: [table.labId, table.alarmId], foreignColumns: [alarms.labId, alarms.id] }),
    index('alarm_history_alarm').on(table.labId, table.alarmId, table.seq),
    index('alarm_history_at').on(table.labId, table.at),
    index('alarm_history_run').on(table.labId, table.runId),
  ],
);

/** Every message that went out for an alarm, or could not. */
export const alarmHops = pgTable(
  'alarm_hops',
  {
    labId: key('lab_id').notNull(),
    seq: bigserial('seq', { mode: 'number' }).notNull(),
    alarmId: key('alarm_id').notNull(),
    occurrence: integer('occurrence').notNull(),
    at: instant('at').notNull(),
    /** Null: it was for nobody in particular, for example that nobody was left. */
    userId: key('user_id'),
    name: text('name').notNull(),
    means: text('means', { enum: ['push', 'mail', 'none'] }).notNull(),
    outcome: text('outcome', { enum: ['sent', 'failed', 'not-set-up'] }).notNull(),
    detail: text('detail').notNull().default(''),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.seq] }),
    foreignKey({ columns: [table.labId, table.alarmId], foreignColumns: [alarms.labId, alarms.id] }),
    index('alarm_hops_alarm').on(table.labId, table.alarmId, table.seq),
  ],
);

/** Limits that the lab set for channels. */
export const channelLimits = pgTable(
  'channel_limits',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    channelId: key('channel_id').notNull(),
    limit: json('limit').$type<ChannelLimit>().notNull(),
    changedAt: instant('changed_at').notNull(),
    changedBy: text('changed_by').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.channelId], foreignColumns: [channels.labId, channels.id] }),
  ],
);

/** Whom a lab's alarms ring, and the outside watcher that gets its sign of life. */
export const labCalls = pgTable('lab_calls', {
  labId: key('lab_id')
    .primaryKey()
    .references(() => labs.id),
  settings: json('settings').$type<CallSettings>().notNull(),
  /** Null: no sign of life is sent. */
  signUrl: text('sign_url'),
  signAt: instant('sign_at'),
  signOk: boolean('sign_ok'),
  signDetail: text('sign_detail').notNull().default(''),
  /** Since when no sign was taken; null while they are. */
  signFailingSince: instant('sign_failing_since'),
});

/** What each member set for himself or herself. */
export const ownCalls = pgTable(
  'own_calls',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    userId: key('user_id')
      .notNull()
      .references(() => users.id, { onDelete: 'cascade' }),
    own: json('own').$type<OwnCall>().notNull(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.userId] })],
);

/** Browsers that take push messages for an account. */
export const pushSubscriptions = pgTable(
  'push_subscriptions',
  {
    userId: key('user_id')
      .notNull()
      .references(() => users.id, { onDelete: 'cascade' }),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    endpoint: text('endpoint').notNull(),
    /** Public key of the browser, base64url. */
    p256dh: text('p256dh').notNull(),
    auth: text('auth').notNull(),
    /** What the browser calls itself, so that its owner knows it again. */
    device: text('device').notNull(),
    madeAt: instant('made_at').notNull(),
    lastSentAt: instant('last_sent_at'),
  },
  (table) => [primaryKey({ columns: [table.userId, table.id] }), uniqueIndex('push_subscriptions_endpoint').on(table.endpoint)],
);

/** What all server processes share and nobody else may know, for example the key that signs push messages. */
export const serverSecrets = pgTable('server_secrets', {
  name: text('name').primaryKey(),
  value: json('value').$type<unknown>().notNull(),
  madeAt: instant('made_at').notNull(),
});
