import type { PersonalLock } from './lock-keeper';

/** The end of an arm, as it took effect. */
export interface ArmEnd {
  armId: string;
  labId: string;
  rigId: string;
  why: string;
  by: { id: string | null; name: string };
  atUtcMs: number;
}

/** What took effect at a rig and the database has still to learn. */
export type StandingEntry = { kind: 'lock-set'; lock: PersonalLock } | { kind: 'arm-ended'; end: ArmEnd };

/** Keeps, on this computer's disk, personal locks and ends of arms until the database has them: a process that is gone leaves them to the next one. */
export interface StandingJournal {
  /**
   * Resolves when the entry is safe on the disk.
   * @throws Error where the disk does not take it
   */
  keep(entry: StandingEntry): Promise<void>;
  /**
   * What is kept of a rig.
   * @throws Error with a sentence where something is not to be read by this version
   */
  of(rigId: string): Promise<StandingEntry[]>;
  /** Removes what is in the database now. */
  forget(entry: StandingEntry): Promise<void>;
}
