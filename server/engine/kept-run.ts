import type { RunJournal } from '../interfaces/run-journal';
import { RigLostError, type RunStore, StaleRunError, type StoredRun } from '../interfaces/run-store';
import { mergeWrites, withAllToPerform } from './merge-journal';

/**
 * The run as stored, with what a process that is gone could not bring into the database: that is brought there first. It may be asked again
 * after whatever failure. What does not continue the run, because another process drove it on, is set aside, and `onAside` told of.
 */
export async function keptRun(
  found: StoredRun,
  { store, journal, onAside }: { store: RunStore; journal: RunJournal; onAside(error: Error): void },
): Promise<StoredRun> {
  const { labId, runId } = found.start;
  const writes = await journal.read();
  try {
    if (writes.length > 0) {
      await mergeWrites(store, withAllToPerform(writes));
      await journal.clear();
    }
  } catch (error) {
    if (!(error instanceof StaleRunError) || error instanceof RigLostError) throw error;
    const aside = await journal.setAside();
    onAside(new Error(`${error.message}; what this server had kept of it meanwhile lies in ${aside}`));
  }
  return (await store.load(labId, runId)) ?? found;
}
