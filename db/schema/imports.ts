import { sql } from 'drizzle-orm';
import { bigint, foreignKey, index, integer, json, pgTable, primaryKey, text } from 'drizzle-orm/pg-core';
import type * as z from 'zod';
import type { importMappingSchema, importPreviewSchema } from '../../shared/contracts/data';
import { bytea, instant, key } from './columns';
import { channels } from './data';
import { rigs } from './rigs';
import { runs } from './runs';

/**
 * What lies in the object store, or was about to: the row is written before the file, so that nothing lies there that the database does not know.
 * One that nothing refers to is removed by and by.
 */
export const files = pgTable('files', {
  name: text('name').primaryKey(),
  bytes: bigint('bytes', { mode: 'number' }).notNull(),
  /** SHA-256, lower-case hex. */
  sha256: text('sha256').notNull(),
  madeAt: instant('made_at').notNull(),
});

export const imports = pgTable(
  'imports',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    runId: key('run_id').notNull(),
    fileName: text('file_name').notNull(),
    state: text('state', { enum: ['waiting', 'received', 'stored', 'refused'] }).notNull(),
    /** So much has come. */
    bytes: bigint('bytes', { mode: 'number' }).notNull().default(0),
    /** How long the file is that comes in parts; null where it comes at once. */
    wantedBytes: bigint('wanted_bytes', { mode: 'number' }),
    /** When the file was changed last, by the clock of the device that sends it: tells whether a chosen file is the one that came in part. */
    changedAt: instant('changed_at'),
    /** When the last part came, or the file was begun. */
    touchedAt: instant('touched_at')
      .notNull()
      .default(sql`now()`),
    /** The whole file in the object store; null while it comes, and for files from before there was one, which lie in `import_pieces`. */
    objectName: text('object_name').references(() => files.name),
    /** SHA-256 (hex) of the file as sent. */
    sha256: text('sha256'),
    preview: json('preview').$type<z.infer<typeof importPreviewSchema>>(),
    /** How it was read when it was stored. */
    mapping: json('mapping').$type<z.infer<typeof importMappingSchema>>(),
    channelId: key('channel_id'),
    createdAt: instant('created_at').notNull(),
    createdBy: text('created_by').notNull(),
    storedAt: instant('stored_at'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.runId], foreignColumns: [runs.labId, runs.id] }),
    foreignKey({ columns: [table.labId, table.channelId], foreignColumns: [channels.labId, channels.id] }),
    index('imports_run').on(table.labId, table.runId),
    index('imports_unfinished')
      .on(table.touchedAt)
      .where(sql`${table.storedAt} is null`),
  ],
);

/** How files were read into a channel of a rig when one was stored last: the next one of the same make is usually alike. */
export const importMappings = pgTable(
  'import_mappings',
  {
    labId: key('lab_id').notNull(),
    rigId: key('rig_id').notNull(),
    channelName: text('channel_name').notNull(),
    /** Names of the columns of the file. */
    columns: json('columns').$type<string[]>().notNull(),
    mapping: json('mapping').$type<z.infer<typeof importMappingSchema>>().notNull(),
    usedAt: instant('used_at').notNull(),
    usedBy: text('used_by').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.rigId, table.channelName] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
  ],
);

/** The parts of a file while it comes, numbered from 0, so that it can go on after the network was away; then it lies whole in the object store. */
export const importPieces = pgTable(
  'import_pieces',
  {
    labId: key('lab_id').notNull(),
    importId: key('import_id').notNull(),
    number: integer('number').notNull(),
    bytes: bytea('bytes').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.importId, table.number] }),
    foreignKey({ columns: [table.labId, table.importId], foreignColumns: [imports.labId, imports.id] }).onDelete('cascade'),
  ],
);
