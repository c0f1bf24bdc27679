import type { Limits } from '@/firmware-protocol/codec';

/** What a simulated controller is when it is made. */
export interface MachineSetting {
  limits: Limits;
  /** True position at the start, microsteps from the home edge. */
  startSteps: number;
  homed: boolean;
  /** Play of the drive between the directions, microsteps. */
  backlashSteps: number;
  /** Microsteps of a turn of a table that may make whole turns: its flag covers the half turn below the edge. Null: all below it. */
  turnSteps: number | null;
  /** Whether the warning of SPEC 11.6 is over already at the start. */
  warned: boolean;
  /** Number of starts so far: gives the boot identifier. */
  bootCount: number;
  /** How long the controller has been on at the start of the simulation, µs. */
  uptimeUs: number;
  version: { major: number; minor: number };
  firmware: string;
}
