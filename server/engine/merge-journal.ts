import type { RunStore, RunWrite } from '../interfaces/run-store';
import { RigLostError, StaleRunError } from '../interfaces/run-store';
import type { OwnEffect, StoredSnapshot } from './stored-snapshot';

/** The writes as one: all rows and events in their order, and the state they end in. */
function joined(writes: readonly RunWrite[]): RunWrite {
  const [first, last] = [writes[0], writes.at(-1)];
  if (first === undefined || last === undefined) throw new Error('there is nothing to merge');
  return {
    ...last,
    expectedSeq: first.expectedSeq,
    steps: writes.flatMap(({ steps }) => steps),
    events: writes.flatMap(({ events }) => events),
  };
}

/**
 * Brings writes that a journal kept into the store, in one transaction. A part that got there already, although its answer was lost, is not
 * stored twice.
 * @throws StaleRunError when the store's chain goes on otherwise: another process has driven the run since
 * @throws RigLostError when another process has the rig
 */
export async function mergeWrites(store: RunStore, writes: readonly RunWrite[]): Promise<void> {
  const write = joined(writes);
  for (;;) {
    try {
      return await store.commit(await restOf(write, store));
    } catch (error) {
      // Between the look and the commit the write that was left to the journal may have got there after all: the next look tells.
      if (!(error instanceof StaleRunError) || error instanceof OtherChain || error instanceof RigLostError) throw error;
    }
  }
}

/** The store's chain is not the one that these writes continue. */
class OtherChain extends StaleRunError {}

/** What of a write the store does not hold yet. */
async function restOf(write: RunWrite, store: RunStore): Promise<RunWrite> {
  const stored = await store.load(write.labId, write.runId);
  if (stored === null) throw new Error(`run ${write.runId} is not in the database`);
  const { seq, hash } = stored.chain;
  if (seq === write.expectedSeq) return write;
  const known = write.events.findIndex((event) => event.seq === seq && event.hash === hash);
  if (known < 0) throw new OtherChain(`the chain of run ${write.runId} ends at ${seq} and does not go on as it was written here`);
  return { ...write, expectedSeq: seq, events: write.events.slice(known + 1) };
}

/** What the process that wrote these may not have come to: the next one does it, and a repeat is harmless. */
export function withAllToPerform(writes: readonly RunWrite[]): RunWrite[] {
  const toPerform = writes.flatMap(({ snapshot }) => (snapshot as { toPerform?: OwnEffect[] }).toPerform ?? []);
  const last = writes.at(-1);
  if (last === undefined) return [];
  return [...writes.slice(0, -1), { ...last, snapshot: { ...(last.snapshot as StoredSnapshot), toPerform } }];
}
