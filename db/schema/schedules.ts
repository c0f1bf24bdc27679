import { sql } from 'drizzle-orm';
import { foreignKey, index, integer, json, pgTable, primaryKey, text, uniqueIndex } from 'drizzle-orm/pg-core';
import type { RoomHours, SchedulePlan } from '../../shared/schedule/plan';
import { instant, key } from './columns';
import { labs } from './labs';
import { users } from './people';
import { protocolRevisions } from './protocols';
import { massSets, rigs } from './rigs';

/** Runs that start by themselves, once or again and again, at a time of day in the lab's zone. */
export const schedules = pgTable(
  'schedules',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    rigId: key('rig_id').notNull(),
    protocolId: key('protocol_id').notNull(),
    protocolRevision: integer('protocol_revision').notNull(),
    massSetId: key('mass_set_id').notNull(),
    plan: json('plan').$type<SchedulePlan>().notNull(),
    notes: text('notes').notNull().default(''),
    state: text('state', { enum: ['active', 'paused', 'ended'] })
      .notNull()
      .default('active'),
    /** When somebody paused, continued or ended it last; null: nobody did. */
    stateChangedAt: instant('state_changed_at'),
    /** Every start up to here has been decided about. */
    decidedUntilAt: instant('decided_until_at').notNull(),
    /** In whose name it starts. */
    madeById: key('made_by_id')
      .notNull()
      .references(() => users.id),
    madeBy: text('made_by').notNull(),
    madeAt: instant('made_at').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    foreignKey({ columns: [table.labId, table.massSetId], foreignColumns: [massSets.labId, massSets.id] }),
    foreignKey({
      name: 'schedules_revision_fk',
      columns: [table.labId, table.protocolId, table.protocolRevision],
      foreignColumns: [protocolRevisions.labId, protocolRevisions.protocolId, protocolRevisions.number],
    }),
    index('schedules_standing')
      .on(table.labId, table.rigId)
      .where(sql`${table.state} <> 'ended'`),
  ],
);

/** What became of single starts; one that has no row is still to come. */
export const scheduleStarts = pgTable(
  'schedule_starts',
  {
    labId: key('lab_id').notNull(),
    scheduleId: key('schedule_id').notNull(),
    dueAt: instant('due_at').notNull(),
    /** Null while only its missing arm was announced. `taken`: a server is about to start it. */
    outcome: text('outcome', { enum: ['taken', 'started', 'missed', 'skipped'] }),
    why: text('why').notNull().default(''),
    runId: key('run_id'),
    announcedAt: instant('announced_at'),
    decidedAt: instant('decided_at'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.scheduleId, table.dueAt] }),
    foreignKey({
      name: 'schedule_starts_schedule_fk',
      columns: [table.labId, table.scheduleId],
      foreignColumns: [schedules.labId, schedules.id],
    }),
  ],
);

/** Night window and blackout dates of the room a rig stands in. */
export const roomHours = pgTable(
  'room_hours',
  {
    labId: key('lab_id').notNull(),
    rigId: key('rig_id').notNull(),
    hours: json('hours').$type<RoomHours>().notNull(),
    changedAt: instant('changed_at').notNull(),
    changedBy: text('changed_by').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.rigId] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
  ],
);

/** Secret addresses at which a calendar program may read what is planned; only a hash of each is kept. */
export const calendarFeeds = pgTable(
  'calendar_feeds',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    userId: key('user_id')
      .notNull()
      .references(() => users.id, { onDelete: 'cascade' }),
    tokenHash: text('token_hash').notNull(),
    madeAt: instant('made_at').notNull(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.userId] }), uniqueIndex('calendar_feeds_token').on(table.tokenHash)],
);

/** Cards at the doors of the rooms: whom to ring, and the hash of the address at which each can be read without an account. */
export const doorCards = pgTable(
  'door_cards',
  {
    labId: key('lab_id').notNull(),
    rigId: key('rig_id').notNull(),
    ring: text('ring').notNull(),
    tokenHash: text('token_hash').notNull(),
    madeAt: instant('made_at').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.rigId] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    uniqueIndex('door_cards_token').on(table.tokenHash),
  ],
);
