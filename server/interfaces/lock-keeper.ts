/** Somebody's hands are in the rig. */
export interface PersonalLock {
  id: string;
  labId: string;
  rigId: string;
  userId: string;
  name: string;
  note: string;
  setUtcMs: number;
}

/** Personal locks in memory, so that the engine can ask at any instant; the database holds the same. */
export interface LockKeeper {
  /** The locks on a rig, the oldest first. */
  locksOf(rigId: string): readonly PersonalLock[];
  /** In a sentence, whose locks are on the rig; null while there are none. */
  lockedBy(rigId: string): string | null;
  /** Sets one at once: what moves is held and the arm is void; stored as soon as the database can be reached. Setting one's own again changes nothing. */
  set(lock: Omit<PersonalLock, 'id'>): PersonalLock;
  /** Takes one away after that was stored. */
  lifted(rigId: string, lockId: string): void;
  /** Resolves when all that took effect here is on this computer's disk, or cannot be. */
  kept(): Promise<void>;
}
