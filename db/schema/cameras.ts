import { sql } from 'drizzle-orm';
import { doublePrecision, foreignKey, index, integer, json, pgTable, primaryKey, text, uniqueIndex } from 'drizzle-orm/pg-core';
import type { CameraKind, CameraStatus, FrameMoment } from '../../shared/contracts/cameras';
import type { PictureType } from '../../shared/camera/picture';
import { bytea, instant, key } from './columns';
import { rigs } from './rigs';
import { runs } from './runs';

/** A camera that looks at a rig. */
export const cameras = pgTable(
  'cameras',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    rigId: key('rig_id').notNull(),
    name: text('name').notNull(),
    kind: text('kind').$type<CameraKind>().notNull(),
    /** Of a picture or an MJPEG stream. */
    address: text('address'),
    /** Never told to anybody but the camera; gone with its removal. */
    userName: text('user_name'),
    password: text('password'),
    /** SHA-256 (hex) of what a browser names that sends pictures; gone with its removal. */
    tokenHash: text('token_hash'),
    madeAt: instant('made_at').notNull(),
    madeBy: text('made_by').notNull(),
    removedAt: instant('removed_at'),
    removedBy: text('removed_by'),
    /** When somebody last looked at its picture, to some seconds: only then it is asked for one between frames. */
    lookedAt: instant('looked_at'),
    /** As the server that asks it for pictures told it last. */
    status: json('status').$type<CameraStatus>(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.rigId], foreignColumns: [rigs.labId, rigs.id] }),
    index('cameras_rig').on(table.labId, table.rigId),
    uniqueIndex('cameras_token').on(table.tokenHash),
  ],
);

/** The newest picture of each camera. Unlogged (in the migration): after a crash of the database there is the next one. */
export const cameraPictures = pgTable(
  'camera_pictures',
  {
    labId: key('lab_id').notNull(),
    cameraId: key('camera_id').notNull(),
    takenAt: instant('taken_at').notNull(),
    /** Standard uncertainty of that instant, s. */
    uTakenS: doublePrecision('u_taken_s').notNull(),
    type: text('type').$type<PictureType>().notNull(),
    bytes: bytea('bytes').notNull(),
  },
  (table) => [primaryKey({ columns: [table.labId, table.cameraId] })],
);

/** What a camera saw at a moment of a run, or why it saw nothing. */
export const frames = pgTable(
  'frames',
  {
    labId: key('lab_id').notNull(),
    id: key('id')
      .notNull()
      .default(sql`gen_random_uuid()`),
    runId: key('run_id').notNull(),
    cameraId: key('camera_id').notNull(),
    /** As it was called then. */
    cameraName: text('camera_name').notNull(),
    /** Row of the step log. */
    seq: integer('seq').notNull(),
    moment: text('moment').$type<FrameMoment>().notNull(),
    /** When the moment was. */
    at: instant('at').notNull(),
    takenAt: instant('taken_at'),
    uTakenS: doublePrecision('u_taken_s'),
    type: text('type').$type<PictureType>(),
    sha256: text('sha256'),
    size: integer('size').notNull(),
    bytes: bytea('bytes'),
    /** Why there is no picture. */
    note: text('note'),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.id] }),
    foreignKey({ columns: [table.labId, table.runId], foreignColumns: [runs.labId, runs.id] }),
    foreignKey({ columns: [table.labId, table.cameraId], foreignColumns: [cameras.labId, cameras.id] }),
    uniqueIndex('frames_moment').on(table.labId, table.runId, table.cameraId, table.seq, table.moment),
  ],
);
