import { doublePrecision, foreignKey, integer, pgTable, primaryKey, text } from 'drizzle-orm/pg-core';
import { instant, key } from './columns';
import { channels } from './data';

/** What the readings of a channel truly say, revision by revision: value = offset + slope · reading, in the channel's unit. Never changed, never deleted. */
export const channelCalibrations = pgTable(
  'channel_calibrations',
  {
    labId: key('lab_id').notNull(),
    channelId: key('channel_id').notNull(),
    /** From 1. */
    revision: integer('revision').notNull(),
    /** Runs that began before go by an earlier revision. */
    validFrom: instant('valid_from').notNull(),
    offset: doublePrecision('offset').notNull(),
    slope: doublePrecision('slope').notNull(),
    /** Standard uncertainties and their covariance. */
    uOffset: doublePrecision('u_offset').notNull(),
    uSlope: doublePrecision('u_slope').notNull(),
    covariance: doublePrecision('covariance').notNull(),
    /** Where it comes from. */
    note: text('note').notNull(),
    madeAt: instant('made_at').notNull(),
    madeBy: text('made_by').notNull(),
  },
  (table) => [
    primaryKey({ columns: [table.labId, table.channelId, table.revision] }),
    foreignKey({ columns: [table.labId, table.channelId], foreignColumns: [channels.labId, channels.id] }),
  ],
);
