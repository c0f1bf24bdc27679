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

/** Arms in memory, so that the engine can ask at any instant; the database holds the same. */
export interface ArmKeeper {
  /** The arm that holds now, or null. */
  armOf(rigId: string): StandingArm | null;
  /** After an arm was stored. */
  set(rigId: string, arm: StandingArm): void;
  /** Ends the arm at once, and in the database as soon as it can be reached. */
  end(rig: { labId: string; rigId: string }, why: string, by: { id: string | null; name: string }): void;
}
