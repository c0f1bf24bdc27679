import { sql } from 'drizzle-orm';
import { foreignKey, integer, json, pgTable, primaryKey, text } from 'drizzle-orm/pg-core';
import type { ProtocolDocument } from '../../shared/protocol/document';
import { instant, key } from './columns';
import { labs } from './labs';
import { users } from './people';
import { rigRevisions } from './rigs';

/** A protocol and its draft. */
export const protocols = pgTable(
  'protocols',
  {
    labId: key('lab_id')
      .notNull()
      .references(() => labs.id),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    name: text('name').notNull(),
    document: json('document').$type<ProtocolDocument>().notNull(),
    /** Rises with each saved draft: the ETag. */
    version: integer('version').notNull().default(1),
    updatedAt: instant('updated_at').notNull(),
    updatedById: key('updated_by_id')
      .notNull()
      .references(() => users.id),
    updatedBy: text('updated_by').notNull(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.id] })],
);

/** Issued and immutable: a trigger refuses UPDATE and DELETE. */
export const protocolRevisions = pgTable(
  'protocol_revisions',
  {
    labId: key('lab_id').notNull(),
    protocolId: key('protocol_id').notNull(),
    number: integer('number').notNull(),
    document: json('document').$type<ProtocolDocument>().notNull(),
    /** SHA-256 (hex) of the RFC 8785 canonical JSON of the document. */
    sha256: text('sha256').notNull(),
    note: text('note').notNull().default(''),
    /** Version of the draft it was issued from. */
    draftVersion: integer('draft_version').notNull(),
    /** The rig revision it was checked against. */
    rigId: key('rig_id').notNull(),
    rigRevision: integer('rig_revision').notNull(),
    issuedAt: instant('issued_at').notNull(),
    issuedById: key('issued_by_id')
      .notNull()
      .references(() => users.id),
    issuedBy: text('issued_by').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.protocolId, table.number] }),
    foreignKey({ columns: [table.labId, table.protocolId], foreignColumns: [protocols.labId, protocols.id] }),
    foreignKey({
      name: 'protocol_revisions_rig_revision_fk',
      columns: [table.labId, table.rigId, table.rigRevision],
      foreignColumns: [rigRevisions.labId, rigRevisions.rigId, rigRevisions.number],
    }),
  ],
);
