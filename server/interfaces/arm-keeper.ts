/** Who answers for a rig, and until when. */
export interface StandingArm {
  id: string;
  name: string;
  note: string;
  fromUtcMs: number;
  untilUtcMs: number;
  /** Start of the controller for which it was given; null: not known. */
  bootId: string | null;
}

/** Why nobody answers for the rig any more. */
export interface EndedArm {
  name: string;
  why: string;
  atUtcMs: number;
}

/** Arms in memory, so that the engine can ask at any instant; the database holds the same. */
export interface ArmKeeper {
  /** The arm that holds now, or null. */
  armOf(rigId: string): StandingArm | null;
  /** How the last arm ended, or why the last arming came to nothing; null while an arm stands or none ever did. */
  endedOf(rigId: string): EndedArm | null;
  /** Ends the arm at once, and in the database as soon as it can be reached. */
  end(rig: { labId: string; rigId: string }, why: string, by: { id: string | null; name: string }): void;
  /** Resolves when all that took effect here is on this computer's disk, or cannot be. */
  kept(): Promise<void>;
}
