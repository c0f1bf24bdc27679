import { sql } from 'drizzle-orm';
import {
  bigint,
  boolean,
  doublePrecision,
  foreignKey,
  index,
  integer,
  json,
  pgTable,
  primaryKey,
  smallint,
  text,
  unique,
  uniqueIndex,
} from 'drizzle-orm/pg-core';
import type { BrokerStatus, BrokerTopic } from '../../shared/contracts/brokers';
import type { GBasis } from '@/shared/evaluation/g-basis';
import type { ClockChoice } from '../../shared/evaluation/clock-choice';
import type { EvaluationResult, FitCurve } from '../../shared/evaluation/result';
import { instant, key } from './columns';
import { labs } from './labs';
import { rigs } from './rigs';
import { runs } from './runs';

export const channels = pgTable(
  'channels',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    rigId: key('rig_id').notNull(),
    /** Set for a channel of one run alone (a rehearsal's), whose instants may lie over those of other runs. */
    runId: key('run_id'),
    name: text('name').notNull(),
    quantity: text('quantity').notNull(),
    unit: text('unit').notNull(),
    role: text('role', { enum: ['deflection', 'environment', 'turntable'] }).notNull(),
    source: text('source', { enum: ['simulated', 'import', 'stream'] }).notNull(),
    /** Samples a second that are to be expected of a stream; null where nothing is. */
    rateHz: doublePrecision('rate_hz'),
    createdAt: instant('created_at').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    foreignKey({ columns: [table.labId, table.runId], foreignColumns: [runs.labId, runs.id] }),
    uniqueIndex('channels_name_of_rig')
      .on(table.labId, table.rigId, table.name)
      .where(sql`${table.runId} is null`),
    uniqueIndex('channels_name_of_run')
      .on(table.labId, table.runId, table.name)
      .where(sql`${table.runId} is not null`),
  ],
);

/** What a device (a camera tracker, a sensor board) signs its samples with: it can append to the channels named, and nothing else. */
export const deviceTokens = pgTable(
  'device_tokens',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    rigId: key('rig_id').notNull(),
    /** The device, in the words of whoever made the token. */
    name: text('name').notNull(),
    tokenHash: text('token_hash').notNull(),
    /** Names of channels of the rig. */
    channels: json('channels').$type<string[]>().notNull(),
    madeAt: instant('made_at').notNull(),
    madeBy: text('made_by').notNull(),
    lastUsedAt: instant('last_used_at'),
    revokedAt: instant('revoked_at'),
    revokedBy: text('revoked_by'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    uniqueIndex('device_tokens_hash').on(table.tokenHash),
    index('device_tokens_rig').on(table.labId, table.rigId),
  ],
);

/** An MQTT broker whose messages fill channels of a rig. */
export const brokers = pgTable(
  'brokers',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    rigId: key('rig_id').notNull(),
    address: text('address').notNull(),
    /** Never told to anybody but the broker; gone with its removal. The password is sealed. */
    userName: text('user_name'),
    password: text('password'),
    /** Certificate that proves the broker's own, PEM; null: those that the system trusts. */
    ca: text('ca'),
    topics: json('topics').$type<BrokerTopic[]>().notNull(),
    madeAt: instant('made_at').notNull(),
    madeBy: text('made_by').notNull(),
    removedAt: instant('removed_at'),
    removedBy: text('removed_by'),
    /** As the server that listens told it last. */
    status: json('status').$type<BrokerStatus>(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    index('brokers_rig').on(table.labId, table.rigId),
  ],
);

/**
 * Partitioned by month of `at` (hand-written migration). No foreign key to the channel: its check for each row would
 * cost more than the row, so the sample store checks the channel once for each batch, in the same transaction.
 */
export const samples = pgTable(
  'samples',
  {
    labId: key('lab_id').notNull(),
    channelId: key('channel_id').notNull(),
    /** Mid-exposure. */
    at: instant('at').notNull(),
    /** In the channel's unit. */
    value: doublePrecision('value').notNull(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.channelId, table.at] })],
);

/**
 * What the samples of a channel come to in buckets of time, level by level: 2 s · 8ˡᵉᵛᵉˡ wide, aligned to the epoch. Recomputed with every write by the
 * hand-written function `summarise_samples`; a bucket without samples has no row.
 */
export const sampleSummaries = pgTable(
  'sample_summaries',
  {
    labId: key('lab_id').notNull(),
    channelId: key('channel_id').notNull(),
    level: smallint('level').notNull(),
    /** Where the bucket begins. */
    at: instant('at').notNull(),
    count: bigint('count', { mode: 'number' }).notNull(),
    /** In the channel's unit; of equal ones the first. */
    least: doublePrecision('least').notNull(),
    leastAt: instant('least_at').notNull(),
    greatest: doublePrecision('greatest').notNull(),
    greatestAt: instant('greatest_at').notNull(),
    mean: doublePrecision('mean').notNull(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.channelId, table.level, table.at] })],
);

/** How long samples of a channel are kept; `channelId` null: those of every channel of the lab that has no rule of its own. Without a rule: for ever. */
export const retentionRules = pgTable(
  'retention_rules',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    channelId: key('channel_id'),
    /** Of a channel: as the lab does; its days say nothing. */
    asLab: boolean('as_lab').notNull(),
    /** Null: for ever. */
    keepDays: integer('keep_days'),
    decidedAt: instant('decided_at').notNull(),
    decidedBy: text('decided_by').notNull(),
  },
  (table) => [
    unique('retention_rules_one').on(table.labId, table.channelId).nullsNotDistinct(),
    foreignKey({ columns: [table.labId, table.channelId], foreignColumns: [channels.labId, channels.id] }),
  ],
);

/**
 * Stretches of a channel of which the summaries alone are left: its samples were taken away by a rule. They begin and end where buckets of level 0 do, no two
 * overlap, and nothing is written there any more (hand-written functions see to that).
 */
export const thinnedStretches = pgTable(
  'thinned_stretches',
  {
    labId: key('lab_id').notNull(),
    channelId: key('channel_id').notNull(),
    fromAt: instant('from_at').notNull(),
    toAt: instant('to_at').notNull(),
    /** Samples that were taken away. */
    samples: bigint('samples', { mode: 'number' }).notNull(),
    /** Those of them that the audit chain does not tell of yet. */
    untold: bigint('untold', { mode: 'number' }).notNull(),
    thinnedAt: instant('thinned_at').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.channelId, table.fromAt] }),
    foreignKey({ columns: [table.labId, table.channelId], foreignColumns: [channels.labId, channels.id] }),
  ],
);

/** Stretches of runs whose samples are not evaluated. Never deleted; withdrawn once at most, then never changed (hand-written triggers). */
export const exclusions = pgTable(
  'exclusions',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    runId: key('run_id').notNull(),
    startUtcMs: instant('start_at').notNull(),
    endUtcMs: instant('end_at').notNull(),
    madeAt: instant('made_at').notNull(),
    madeBy: text('made_by').notNull(),
    reason: text('reason').notNull(),
    withdrawnAt: instant('withdrawn_at'),
    withdrawnBy: text('withdrawn_by'),
    withdrawnReason: text('withdrawn_reason'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.runId], foreignColumns: [runs.labId, runs.id] }),
    index('exclusions_run').on(table.labId, table.runId, table.startUtcMs),
  ],
);

export const evaluations = pgTable(
  'evaluations',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    runId: key('run_id').notNull(),
    state: text('state', { enum: ['queued', 'running', 'done', 'failed'] }).notNull(),
    channel: text('channel'),
    /** What somebody decided about the channel's clock; null: as the data tell it. */
    clock: json('clock').$type<ClockChoice>(),
    createdAt: instant('created_at').notNull(),
    createdBy: text('created_by').notNull(),
    finishedAt: instant('finished_at'),
    error: text('error'),
    result: json('result').$type<EvaluationResult>(),
    curves: json('curves').$type<FitCurve[]>(),
    /** What G was computed from, for values that are tried; null where there is none. */
    basis: json('basis').$type<GBasis>(),
    /** Version of the software that computed the result; null before it ends, and where none was kept. */
    software: text('software'),
    /** The frozen evaluation that this one computes again. */
    recomputes: key('recomputes'),
    frozenAt: instant('frozen_at'),
    frozenBy: text('frozen_by'),
    frozenReason: text('frozen_reason'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.runId], foreignColumns: [runs.labId, runs.id] }),
    index('evaluations_run').on(table.labId, table.runId, table.createdAt),
  ],
);
