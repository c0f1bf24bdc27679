import { sql } from 'drizzle-orm';
import { bigint, check, foreignKey, index, integer, json, pgTable, primaryKey, text, uniqueIndex } from 'drizzle-orm/pg-core';
import type { LinkSettings } from '../../shared/contracts/rigs';
import type { RigDocument } from '../../shared/rig/document';
import { instant, key } from './columns';
import { labs } from './labs';
import { users } from './people';

export const rigs = pgTable(
  'rigs',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    name: text('name').notNull(),
    /** Number of the revision that holds now. */
    revision: integer('revision').notNull(),
    createdAt: instant('created_at').notNull(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.id] })],
);

/** Immutable: a trigger refuses UPDATE and DELETE. */
export const rigRevisions = pgTable(
  'rig_revisions',
  {
    labId: key('lab_id').notNull(),
    rigId: key('rig_id').notNull(),
    number: integer('number').notNull(),
    name: text('name').notNull(),
    document: json('document').$type<RigDocument>().notNull(),
    reason: text('reason').notNull(),
    madeAt: instant('made_at').notNull(),
    madeById: key('made_by_id')
      .notNull()
      .references(() => users.id),
    madeBy: text('made_by').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.rigId, table.number] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
  ],
);

/** How the rig's controller is reached; one row for each rig. */
export const rigLinks = pgTable(
  'rig_links',
  {
    labId: key('lab_id').notNull(),
    rigId: key('rig_id').notNull(),
    settings: json('settings').$type<LinkSettings>().notNull(),
    changedAt: instant('changed_at').notNull(),
    changedBy: text('changed_by').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.rigId] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
  ],
);

/** Which process drives the rig. `epoch` rises with each new holder and travels to the controller as a fence. */
export const rigLeases = pgTable(
  'rig_leases',
  {
    labId: key('lab_id').notNull(),
    rigId: key('rig_id').notNull(),
    holder: text('holder').notNull(),
    epoch: bigint('epoch', { mode: 'number' }).notNull(),
    untilAt: instant('until_at').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.rigId] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
  ],
);

/** What a process without rigs asks of one that drives them; a row lives for seconds. */
export const rigQuestions = pgTable(
  'rig_questions',
  {
    labId: key('lab_id').notNull(),
    id: key('id').notNull(),
    question: json('question').$type<unknown>().notNull(),
    askedAt: instant('asked_at').notNull(),
    /** Process that has taken it; null while nobody has. */
    takenBy: text('taken_by'),
    reply: json('reply').$type<unknown>(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.id] })],
);

/** Somebody on site answers for the rig from `fromAt` until `untilAt`, or until the arm is ended earlier. */
export const arms = pgTable(
  'arms',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    rigId: key('rig_id').notNull(),
    name: text('name').notNull(),
    note: text('note').notNull().default(''),
    fromAt: instant('from_at').notNull(),
    untilAt: instant('until_at').notNull(),
    armedById: key('armed_by_id')
      .notNull()
      .references(() => users.id),
    /** Start of the controller for which the arm was given; an arm of before this column has none. */
    bootId: text('boot_id'),
    endedAt: instant('ended_at'),
    endedWhy: text('ended_why'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    uniqueIndex('arms_one_per_rig')
      .on(table.labId, table.rigId)
      .where(sql`${table.endedAt} is null`),
    index('arms_rig').on(table.labId, table.rigId, table.fromAt),
    check('arms_length', sql`${table.untilAt} > ${table.fromAt} and ${table.untilAt} <= ${table.fromAt} + interval '72 hours'`),
  ],
);

/** "My hands are in the rig": nothing moves on the rig until every lock is lifted, each by the one who set it or by an owner with a reason. */
export const personalLocks = pgTable(
  'personal_locks',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    rigId: key('rig_id').notNull(),
    userId: key('user_id')
      .notNull()
      .references(() => users.id),
    name: text('name').notNull(),
    note: text('note').notNull().default(''),
    setAt: instant('set_at').notNull(),
    liftedAt: instant('lifted_at'),
    liftedBy: text('lifted_by'),
    /** Why somebody else lifted it; null where it was lifted by the one who set it. */
    liftedWhy: text('lifted_why'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    uniqueIndex('personal_locks_one_each')
      .on(table.labId, table.rigId, table.userId)
      .where(sql`${table.liftedAt} is null`),
  ],
);

/** Who has signed the cautions for a rig, in which version of their words and when. */
export const cautionSignatures = pgTable(
  'caution_signatures',
  {
    labId: key('lab_id').notNull(),
    rigId: key('rig_id').notNull(),
    userId: key('user_id')
      .notNull()
      .references(() => users.id),
    version: integer('version').notNull(),
    name: text('name').notNull(),
    /** SHA-256 of the words that were signed. */
    textHash: text('text_hash').notNull(),
    signedAt: instant('signed_at').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.rigId, table.userId, table.version] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
  ],
);

export const massSets = pgTable(
  'mass_sets',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    rigId: key('rig_id').notNull(),
    label: text('label').notNull(),
    sources: json('sources').$type<RigDocument['sources']>().notNull(),
    createdAt: instant('created_at').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    uniqueIndex('mass_sets_label').on(table.labId, table.rigId, table.label),
  ],
);
