import { sql } from 'drizzle-orm';
import {
  boolean,
  check,
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
import type { RunStart, StepOutcome, StepRow, StepRowKind } from '../../shared/archive/run-records';
import type { RunState } from '../../shared/contracts/runs';
import { instant, key } from './columns';
import { users } from './people';
import { protocols } from './protocols';
import { massSets, rigRevisions } from './rigs';

export const runs = pgTable(
  'runs',
  {
    labId: key('lab_id').notNull(),
    id: key('id').notNull(),
    rigId: key('rig_id').notNull(),
    rigRevision: integer('rig_revision').notNull(),
    /** Null when the protocol it came from has been deleted since (only a rehearsal of a draft can lose its own). */
    protocolId: key('protocol_id'),
    massSetId: key('mass_set_id'),
    rehearsal: boolean('rehearsal').notNull(),
    // What lists show, taken from `start` so that they need not open it.
    rigName: text('rig_name').notNull(),
    protocolName: text('protocol_name').notNull(),
    protocolRevision: integer('protocol_revision').notNull(),
    massSetLabel: text('mass_set_label').notNull(),
    operator: text('operator').notNull(),
    /** Account of the operator; null for runs of before this column. */
    startedById: key('started_by_id').references(() => users.id),
    /** Everything that was decided before the first motion, protocol and rig included. */
    start: json('start').$type<RunStart>().notNull(),
    /** The engine's own state; null until its first commit. */
    snapshot: json('snapshot').$type<unknown>(),
    chartVersion: integer('chart_version').notNull().default(0),
    /** Last link of the event chain. */
    lastSeq: integer('last_seq').notNull().default(0),
    lastHash: text('last_hash').notNull().default('0'.repeat(64)),
    state: text('state').$type<RunState>().notNull(),
    outcome: text('outcome', { enum: ['finished', 'held', 'stopped', 'failed'] }),
    /** Why it could not be carried on where the engine cannot say so itself. */
    failure: text('failure'),
    createdAt: instant('created_at').notNull(),
    startedAt: instant('started_at'),
    endedAt: instant('ended_at'),
    predictedEndAt: instant('predicted_end_at'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({
      name: 'runs_rig_revision_fk',
      columns: [table.labId, table.rigId, table.rigRevision],
      foreignColumns: [rigRevisions.labId, rigRevisions.rigId, rigRevisions.number],
    }),
    foreignKey({ name: 'runs_protocol_fk', columns: [table.labId, table.protocolId], foreignColumns: [protocols.labId, protocols.id] }),
    foreignKey({ name: 'runs_mass_set_fk', columns: [table.labId, table.massSetId], foreignColumns: [massSets.labId, massSets.id] }),
    // The last word on "one run per rig", whatever two processes may think.
    uniqueIndex('runs_one_per_rig')
      .on(table.labId, table.rigId)
      .where(sql`not ${table.rehearsal} and ${table.state} not in ('finished', 'stopped', 'failed')`),
    index('runs_newest').on(table.labId, table.createdAt.desc()),
    check('runs_id_given', sql`${table.id} <> '00000000-0000-0000-0000-000000000000'`),
  ],
);

/** The event chain. Rows are only ever added: a trigger refuses all else. */
export const runEvents = pgTable(
  'run_events',
  {
    labId: key('lab_id').notNull(),
    runId: key('run_id').notNull(),
    seq: integer('seq').notNull(),
    /** ISO 8601 UTC exactly as hashed. */
    at: text('at').notNull(),
    kind: text('kind').notNull(),
    data: json('data').$type<Record<string, unknown>>().notNull(),
    prev: text('prev').notNull(),
    hash: text('hash').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.runId, table.seq] }),
    foreignKey({ columns: [table.labId, table.runId], foreignColumns: [runs.labId, runs.id] }),
  ],
);

/** What people wrote to rows of the step log. Rows are only ever added: a trigger refuses all else. */
export const stepNotes = pgTable(
  'step_notes',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    runId: key('run_id').notNull(),
    /** Row of the step log. */
    seq: integer('seq').notNull(),
    text: text('text').notNull(),
    writtenAt: instant('written_at').notNull(),
    writtenBy: text('written_by').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({
      name: 'step_notes_step_fk',
      columns: [table.labId, table.runId, table.seq],
      foreignColumns: [runSteps.labId, runSteps.runId, runSteps.seq],
    }),
    index('step_notes_run').on(table.labId, table.runId, table.seq, table.writtenAt),
  ],
);

/** The step log. */
export const runSteps = pgTable(
  'run_steps',
  {
    labId: key('lab_id').notNull(),
    runId: key('run_id').notNull(),
    seq: integer('seq').notNull(),
    path: text('path').notNull(),
    kind: text('kind').$type<StepRowKind>().notNull(),
    label: text('label').notNull(),
    station: text('station').notNull(),
    plannedStartUtcMs: instant('planned_start').notNull(),
    plannedEndUtcMs: instant('planned_end'),
    startUtcMs: instant('started_at').notNull(),
    endUtcMs: instant('ended_at'),
    uStartS: doublePrecision('u_start_s').notNull(),
    uEndS: doublePrecision('u_end_s'),
    angleStartDeg: doublePrecision('angle_start_deg'),
    angleEndDeg: doublePrecision('angle_end_deg'),
    outcome: text('outcome').$type<StepOutcome>(),
    angleSource: text('angle_source').$type<StepRow['angleSource']>().notNull(),
    uAngleDeg: doublePrecision('u_angle_deg'),
    good: boolean('good'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.runId, table.seq] }),
    foreignKey({ columns: [table.labId, table.runId], foreignColumns: [runs.labId, runs.id] }),
  ],
);
