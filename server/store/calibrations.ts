import { and, asc, desc, eq, inArray, lte, sql } from 'drizzle-orm';
import { channelCalibrations, channels } from '@/db/schema';
import { one, type Handle, type Transaction } from './database';
import type { ChannelRecord } from './imports';

export type CalibrationRecord = typeof channelCalibrations.$inferSelect;

/** All revisions of a rig's channels, by name, newest first. */
export const calibrationsOfRig = (
  db: Handle,
  { labId, rigId }: { labId: string; rigId: string },
): Promise<{ calibration: CalibrationRecord; channel: ChannelRecord }[]> =>
  db
    .select({ calibration: channelCalibrations, channel: channels })
    .from(channelCalibrations)
    .innerJoin(channels, and(eq(channels.labId, channelCalibrations.labId), eq(channels.id, channelCalibrations.channelId)))
    .where(and(eq(channels.labId, labId), eq(channels.rigId, rigId)))
    .orderBy(asc(channels.name), desc(channelCalibrations.revision));

/** The next revision of a channel, whose row must be there. */
export async function addCalibration(tx: Transaction, wanted: Omit<CalibrationRecord, 'revision'>): Promise<CalibrationRecord> {
  const { labId, channelId } = wanted;
  // One after the other: two that come at once get two numbers.
  await tx
    .select({ id: channels.id })
    .from(channels)
    .where(and(eq(channels.labId, labId), eq(channels.id, channelId)))
    .for('no key update');
  const [last] = await tx
    .select({ revision: sql<number>`coalesce(max(${channelCalibrations.revision}), 0)::int` })
    .from(channelCalibrations)
    .where(and(eq(channelCalibrations.labId, labId), eq(channelCalibrations.channelId, channelId)));
  return one(
    await tx
      .insert(channelCalibrations)
      .values({ ...wanted, revision: (last?.revision ?? 0) + 1 })
      .returning(),
  );
}

/**
 * What counts for channels in a run: of the revisions that were known at `knownAtUtcMs` and hold from its beginning or before, the last. By channel; none
 * where there is none.
 */
export async function calibrationsAt(
  db: Handle,
  labId: string,
  { channelIds, beganUtcMs, knownAtUtcMs }: { channelIds: readonly string[]; beganUtcMs: number; knownAtUtcMs: number },
): Promise<Map<string, CalibrationRecord>> {
  if (channelIds.length === 0) return new Map();
  const rows = await db
    .select()
    .from(channelCalibrations)
    .where(
      and(
        eq(channelCalibrations.labId, labId),
        inArray(channelCalibrations.channelId, [...channelIds]),
        lte(channelCalibrations.validFrom, beganUtcMs),
        lte(channelCalibrations.madeAt, knownAtUtcMs),
      ),
    )
    .orderBy(asc(channelCalibrations.revision));
  return new Map(rows.map((row) => [row.channelId, row]));
}
