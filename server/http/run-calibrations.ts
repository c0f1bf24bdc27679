import type { ChannelCalibration } from '@/shared/archive/run-records';
import { calibrationsAt } from '../store/calibrations';
import type { RunRecord } from '../store/runs-read';
import type { Services } from './services';

/** What counts for channels of a run: the last revision that holds from its beginning, as far as it was known at an instant. */
export async function calibrationsOfRun(
  { database, clock }: Services,
  { labId, startedAt }: RunRecord,
  { channels, knownAtUtcMs }: { channels: readonly { id: string }[]; knownAtUtcMs: number },
): Promise<Map<string, ChannelCalibration>> {
  const beganUtcMs = startedAt ?? clock.utcMs();
  const found = await calibrationsAt(database.db, labId, { channelIds: channels.map(({ id }) => id), beganUtcMs, knownAtUtcMs });
  return new Map(
    [...found].map(([id, { revision, offset, slope, uOffset, uSlope, covariance }]) => [
      id,
      { revision, offset, slope, uOffset, uSlope, covariance },
    ]),
  );
}
