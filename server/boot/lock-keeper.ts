import type { Logger } from 'pino';
import type { Clock } from '../interfaces/clock';
import type { LockKeeper, PersonalLock } from '../interfaces/lock-keeper';
import type { StandingEntry, StandingJournal } from '../interfaces/standing-journal';
import type { StandingStore } from '../interfaces/standing-store';
import { UntilStored } from './until-stored';

interface Parts {
  store: StandingStore;
  standing: StandingJournal;
  clock: Clock;
  log: Logger;
  newId(): string;
  /** Lets a write go on by itself; `idle` waits for it. */
  background(work: Promise<unknown>, what: string): void;
  /** A lock was set: what moves is held, and nobody's arm stands. */
  onSet(lock: PersonalLock): void;
  onChange(rigId: string): void;
}

/** Locks in memory and in the database. Setting one takes effect here at once, whether or not the database answers. */
export class MemoryLockKeeper implements LockKeeper {
  private readonly locks = new Map<string, PersonalLock[]>();
  private readonly unstored: UntilStored<Extract<StandingEntry, { kind: 'lock-set' }>>;

  constructor(private readonly parts: Parts) {
    const store = ({ lock }: Extract<StandingEntry, { kind: 'lock-set' }>) => parts.store.setLock(lock);
    this.unstored = new UntilStored({ ...parts, kind: 'lock-set', what: 'a personal lock', store });
  }

  /** Reads the locks of a rig that is taken up, those too that a process before this one could not store. */
  async load({ labId, rigId }: { labId: string; rigId: string }): Promise<void> {
    await this.unstored.settle(rigId);
    this.locks.set(rigId, await this.parts.store.locksOf({ labId, rigId }));
  }

  locksOf(rigId: string): readonly PersonalLock[] {
    return this.locks.get(rigId) ?? [];
  }

  lockedBy(rigId: string): string | null {
    const names = this.locksOf(rigId).map(({ name }) => name);
    const last = names.pop();
    if (last === undefined) return null;
    const [who, verb] = names.length === 0 ? [last, 'has hands'] : [`${names.join(', ')} and ${last}`, 'have hands'];
    return `${who} ${verb} in the rig (personal lock). Nothing moves until ${names.length === 0 ? 'it is' : 'they are'} lifted at the rig.`;
  }

  set(wanted: Omit<PersonalLock, 'id'>): PersonalLock {
    const standing = this.locksOf(wanted.rigId);
    const own = standing.find(({ userId }) => userId === wanted.userId);
    if (own !== undefined) return own;
    const lock = { ...wanted, id: this.parts.newId() };
    this.locks.set(lock.rigId, [...standing, lock]);
    this.parts.onSet(lock);
    this.parts.onChange(lock.rigId);
    this.unstored.add({ kind: 'lock-set', lock });
    return lock;
  }

  lifted(rigId: string, lockId: string): void {
    this.locks.set(
      rigId,
      this.locksOf(rigId).filter(({ id }) => id !== lockId),
    );
    this.parts.onChange(rigId);
  }

  kept(): Promise<void> {
    return this.unstored.kept();
  }

  close(): void {
    this.unstored.close();
  }
}
