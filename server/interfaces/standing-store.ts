import type { StandingArm } from './arm-keeper';
import type { PersonalLock } from './lock-keeper';

interface OfRig {
  labId: string;
  rigId: string;
}

/** Who did it: an account, or the server itself. */
interface Actor {
  id: string | null;
  name: string;
}

/** The arm that was given last, whether or not it still holds. */
export interface StoredArm extends StandingArm {
  endedUtcMs: number | null;
  endedWhy: string | null;
}

/** What outlives a process of who answers for rigs and whose hands are in them. Each write brings its entry in the audit chain along. */
export interface StandingStore {
  newestArm(rig: OfRig): Promise<StoredArm | null>;
  /** From then on it stands; one that still stood is ended by it. `by`: whose account asked. */
  giveArm(arm: OfRig & Omit<StandingArm, 'id'> & { by: { id: string; name: string } }): Promise<StandingArm>;
  /** An arming came to nothing. */
  notArmed(rig: OfRig, fact: { name: string; why: string; by: Actor; atUtcMs: number }): Promise<void>;
  /** Nothing, where another arm stands by now. */
  endArm(rig: OfRig, end: { armId: string; why: string; by: Actor; atUtcMs: number }): Promise<void>;
  /** Those that nobody has lifted, the oldest first. */
  locksOf(rig: OfRig): Promise<PersonalLock[]>;
  /** Nothing, where that person has one on the rig already. */
  setLock(lock: PersonalLock): Promise<void>;
}
