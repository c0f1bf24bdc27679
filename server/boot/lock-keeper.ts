import { randomUUID } from 'node:crypto';
import type { Logger } from 'pino';
import type { Clock } from '../interfaces/clock';
import type { LockKeeper, PersonalLock } from '../interfaces/lock-keeper';
import { appendAudit } from '../store/audit';
import type { Connection } from '../store/database';
import { insertLock, standingLocks } from '../store/locks';

interface Parts {
  database: Connection;
  clock: Clock;
  log: Logger;
  sha256(text: string): string;
  /** Lets a write go on by itself; `idle` waits for it. */
  background(work: Promise<unknown>, what: string): void;
  /** A lock was set: what moves is held, and nobody's arm stands. */
  onSet(lock: PersonalLock): void;
  onChange(rigId: string): void;
}

const retryMs = 5_000;

/** Locks in memory and in the database. Setting one takes effect here at once, whether or not the database answers. */
export class MemoryLockKeeper implements LockKeeper {
  private readonly locks = new Map<string, PersonalLock[]>();
  private closed = false;

  constructor(private readonly parts: Parts) {}

  /** Reads the locks of a rig that is taken up. */
  async load({ labId, rigId }: { labId: string; rigId: string }): Promise<void> {
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
    this.parts.background(this.store(lock), 'a personal lock');
    return lock;
  }

  lifted(rigId: string, lockId: string): void {
    this.locks.set(
      rigId,
      this.locksOf(rigId).filter(({ id }) => id !== lockId),
    );
    this.parts.onChange(rigId);
  }

  close(): void {
    this.closed = true;
  }

  /** Tries until it is stored: a lock must not be gone after a restart. */
  private async store(lock: PersonalLock): Promise<void> {
    const { database, clock, log, sha256 } = this.parts;
    const { labId, rigId, userId, name, note, setUtcMs } = lock;
    while (!this.closed) {
      try {
        await database.db.transaction(async (tx) => {
          if (!(await insertLock(tx, { id: lock.id, labId, rigId, userId, name, note, setAt: setUtcMs }))) return;
          const data = { rigId, lockId: lock.id, note };
          await appendAudit(tx, { labId, who: { id: userId, name }, kind: 'rig.lock-set', data, utcMs: setUtcMs }, sha256);
        });
        return;
      } catch (error) {
        log.warn({ err: error, rigId }, 'a personal lock is not stored yet');
        await new Promise<void>((resolve) => void clock.after(retryMs, resolve));
      }
    }
  }
}
