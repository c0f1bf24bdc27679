import { MemoryJournals } from '@/server/engine/memory-journal';
import { type QuarantinedRun, RigSupervisor, StartRefused } from '@/server/engine/rig-supervisor';
import { VirtualClock } from '@/server/engine/virtual-clock';
import type { Arm, Effect } from '@/server/engine/run-context';
import type { LeftOpen, RunStore, RunWrite, StoredRun } from '@/server/interfaces/run-store';
import { isPassing } from '@/server/store/failures';
import type { RunStart } from '@/shared/archive/run-records';
import { FakeLink } from './fake-link';
import { MemoryStore, runStart, settle, sha256, shortProtocol, startUtcMs } from './rig-bench';

/** Two rigs on one fake clock, the runs of both in memory, and supervisors that drive them. */

/** Several runs behind one store interface. */
class Runs implements RunStore {
  readonly byId = new Map<string, MemoryStore>();
  add(start: RunStart): RunStart {
    this.byId.set(start.runId, new MemoryStore(start));
    return start;
  }
  load = (_labId: string, runId: string): Promise<StoredRun | null> => this.byId.get(runId)?.load() ?? Promise.resolve(null);
  leftOpen = (_labId: string, runId: string): Promise<LeftOpen> => (this.byId.get(runId) as MemoryStore).leftOpen();
  unfinished = async (): Promise<StoredRun[]> => (await Promise.all([...this.byId.values()].map((store) => store.unfinished()))).flat();
  commit = (write: RunWrite): Promise<void> => (this.byId.get(write.runId) as MemoryStore).commit(write);
}

export interface Lab {
  clock: VirtualClock;
  links: Map<string, FakeLink>;
  runs: Runs;
  performed: Effect[];
  arms: Map<string, Arm>;
  journals: MemoryJournals;
  quarantined: QuarantinedRun[];
  newSupervisor(): RigSupervisor;
  make(more?: Partial<RunStart>): RunStart;
  north: FakeLink;
}

export function makeLab(): Lab {
  const clock = new VirtualClock(startUtcMs, settle);
  const links = new Map(['north-bench', 'south-bench'].map((rigId) => [rigId, new FakeLink(clock)]));
  const runs = new Runs();
  const performed: Effect[] = [];
  const arms = new Map<string, Arm>(['north-bench', 'south-bench'].map((rigId) => [rigId, runStart().arm as Arm]));
  const journals = new MemoryJournals();
  const quarantined: QuarantinedRun[] = [];
  const newSupervisor = () =>
    new RigSupervisor({
      store: runs,
      journals,
      clock,
      sha256,
      linkOf: (rigId) => links.get(rigId) ?? null,
      guidedBy: () => null,
      armOf: (rigId) => arms.get(rigId) ?? null,
      whyDisarmed: () => '',
      lockedBy: () => null,
      perform: (effect) => performed.push(effect),
      isPassing,
      onQuarantine: (run) => quarantined.push(run),
    });
  const make = (more: Partial<RunStart> = {}) => runs.add(runStart(shortProtocol, more));
  return { clock, links, runs, performed, arms, journals, quarantined, newSupervisor, make, north: links.get('north-bench') as FakeLink };
}

/** What a start was refused with. */
export const refusal = (start: () => unknown): StartRefused => {
  try {
    start();
  } catch (error) {
    if (error instanceof StartRefused) return error;
    throw error;
  }
  throw new Error('it was not refused');
};
