import type { PersonalLock } from '@/server/interfaces/lock-keeper';
import type { StandingEntry, StandingJournal } from '@/server/interfaces/standing-journal';
import type { StandingStore, StoredArm } from '@/server/interfaces/standing-store';
import { databaseAway, type SimulatedStore } from './simulated-store';

/** Arms and personal locks in the database of a night: they are away with it, and outlive every process. */
export class SimulatedStanding {
  private readonly arms: StoredArm[] = [];
  readonly locks: PersonalLock[] = [];
  private readonly entries = new Set<string>();
  /** On the disk of the machine, which outlives its processes. */
  readonly disk: StandingJournal = {
    keep: async (entry) => void this.entries.add(JSON.stringify(entry)),
    of: async () => [...this.entries].map((entry) => JSON.parse(entry) as StandingEntry),
    forget: async (entry) => void this.entries.delete(JSON.stringify(entry)),
  };

  constructor(private readonly database: SimulatedStore) {}

  /** As a process reaches it: one that is dead writes nothing. */
  of(isAlive: () => boolean): StandingStore {
    const write = <T>(deed: () => T) => {
      if (!isAlive()) throw new Error('the process is dead');
      return this.database.write(deed);
    };
    const read = async <T>(found: T): Promise<T> => {
      if (this.database.away) throw databaseAway();
      return found;
    };
    return {
      newestArm: () => read(this.arms.at(-1) ?? null),
      giveArm: async ({ name, note, fromUtcMs, untilUtcMs, bootId }) =>
        write(() => {
          this.end('armed anew', fromUtcMs);
          const arm = { id: `arm ${this.arms.length + 1}`, ...{ name, note, fromUtcMs, untilUtcMs, bootId } };
          this.arms.push({ ...arm, endedUtcMs: null, endedWhy: null });
          return arm;
        }),
      notArmed: async () => write(() => undefined),
      endArm: async (_, { armId, why, atUtcMs }) =>
        write(() => {
          if (this.arms.at(-1)?.id === armId) this.end(why, atUtcMs);
        }),
      locksOf: () => read([...this.locks]),
      setLock: async (lock) =>
        write(() => {
          if (!this.locks.some(({ userId }) => userId === lock.userId)) this.locks.push(lock);
        }),
    };
  }

  /** As the route that lifts a lock: it is stored there too, where that has not been done yet. */
  lift(lock: PersonalLock): Promise<void> {
    return this.database.write(() => {
      const at = this.locks.findIndex(({ id }) => id === lock.id);
      if (at >= 0) this.locks.splice(at, 1);
    });
  }

  private end(why: string, utcMs: number): void {
    const last = this.arms.at(-1);
    if (last?.endedUtcMs === null) Object.assign(last, { endedUtcMs: utcMs, endedWhy: why });
  }
}
