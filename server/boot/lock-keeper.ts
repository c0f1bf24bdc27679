import { randomUUID } from 'node:crypto';
import type { Logger } from 'pino';
import type { Clock } from '../interfaces/clock';
import type { LockKeeper, PersonalLock } from '../interfaces/lock-keeper';
import type { StandingEntry, StandingJournal } from '../interfaces/standing-journal';
import { appendAudit } from '../store/audit';
import type { Connection } from '../store/database';
import { insertLock, standingLocks } from '../store/locks';
import { UntilStored } from './until-stored';

interface Parts {
  database: Connection;
  standing: StandingJournal;
  clock: Clock;
  log: Logger;
  sha256(text: string): string;
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
    this.unstored = new UntilStored({ ...parts, kind: 'lock-set', what: 'a personal lock', store: ({ lock }) => this.store(lock) });
  }

  /** Reads the locks of a rig that is taken up, those too that a process before this one could not store. */
  async load({ labId, rigId }: { labId: string; rigId: string }): Promise<void> {
    await this.unstored.settle(rigId);
    const rows = await standingLocks(this.parts.database.db, { labId, rigId });
    this.locks.set(
      rigId,
      rows.map(({ id, userId, name, note, setAt }) => ({ id, labId, rigId, userId, name, note, setUtcMs: setAt })),
    );
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
    const lock = { ...wanted, id: randomUUID() };
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

  private async store(lock: PersonalLock): Promise<void> {
    const { database, sha256 } = this.parts;
    const { labId, rigId, userId, name, note, setUtcMs } = lock;
    await database.db.transaction(async (tx) => {
      if (!(await insertLock(tx, { id: lock.id, labId, rigId, userId, name, note, setAt: setUtcMs }))) return;
      const data = { rigId, lockId: lock.id, note };
      await appendAudit(tx, { labId, who: { id: userId, name }, kind: 'rig.lock-set', data, utcMs: setUtcMs }, sha256);
    });
  }
}
