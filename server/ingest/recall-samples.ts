import type { SampleStore } from '../interfaces/sample-store';
import type { Connection } from '../store/database';
import { channelsOfRig } from '../store/imports';
import { KEPT_MS, type RecentSamples } from './recent-samples';

/** What a process that is gone had in memory: the last hours of every channel that is being filled, out of the database. */
export async function recallSamples(
  parts: { database: Connection; samples: SampleStore; recent: RecentSamples },
  { labId, rigId, nowUtcMs }: { labId: string; rigId: string; nowUtcMs: number },
): Promise<void> {
  const channels = await channelsOfRig(parts.database.db, labId, rigId);
  for (const { id, runId, source, name, unit, role, rateHz } of channels) {
    if (runId !== null || source === 'import') continue;
    const batch = await parts.samples.read(labId, id, { fromUtcMs: nowUtcMs - KEPT_MS, toUtcMs: nowUtcMs });
    if (batch.utcMs.length > 0) parts.recent.add(rigId, { name, unit, role, rateHz }, batch);
  }
}
