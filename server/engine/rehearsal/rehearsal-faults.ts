import type { Clock } from '../../interfaces/clock';
import type { ReadoutFaults } from './readout-faults';
import type { RehearsalController } from './rehearsal-parts';

/** Faults of the protocol format that a rehearsal can raise, and what they do. */

const LINK_DROP_MS = 30_000;
const GARBAGE_MS = 1_000;
const INTERLOCK_OPEN_MS = 60_000;
const SENSOR_GAP_MS = 120_000;
const BURST_MS = 60_000;
/** A killed server is back after this. */
export const SERVER_AWAY_MS = 5_000;

export interface FaultTargets {
  clock: Clock;
  controller: RehearsalController;
  readout: ReadoutFaults;
  killServer(): void;
}

const windowOf = (clock: Clock, lengthMs: number) => ({ fromUtcMs: clock.utcMs(), toUtcMs: clock.utcMs() + lengthMs });

const raise = {
  'link-drop': ({ controller }: FaultTargets) => controller.dropLine(LINK_DROP_MS),
  garbage: ({ controller }: FaultTargets) => controller.garbage(GARBAGE_MS),
  'server-kill': ({ killServer }: FaultTargets) => killServer(),
  'controller-reset': ({ controller }: FaultTargets) => controller.reset(),
  'interlock-open': ({ controller, clock }: FaultTargets) => {
    controller.openInterlock();
    clock.after(INTERLOCK_OPEN_MS, () => controller.closeInterlock());
  },
  'sensor-gap': ({ readout, clock }: FaultTargets) => readout.addGap(windowOf(clock, SENSOR_GAP_MS)),
  burst: ({ readout, clock }: FaultTargets) => readout.addBurst(windowOf(clock, BURST_MS)),
} as const;
export type FaultKind = keyof typeof raise;

export const faultKinds = Object.keys(raise) as readonly FaultKind[];

export const isFaultKind = (kind: string): kind is FaultKind => (faultKinds as readonly string[]).includes(kind);

/** Raises each fault `atS` seconds of simulated time from now. */
export function scheduleFaults(faults: readonly { kind: string; atS: number }[], targets: FaultTargets): void {
  for (const { kind, atS } of faults) {
    if (!isFaultKind(kind)) throw new Error(`${kind} is no fault that a rehearsal can raise`);
    targets.clock.after(1000 * atS, () => raise[kind](targets));
  }
}
