import type { Clock } from '../../interfaces/clock';
import type { RehearsalController } from './rehearsal-parts';

/** Faults of the protocol format that a rehearsal can raise, and what they do. */

const LINK_DROP_MS = 30_000;
const GARBAGE_MS = 1_000;
const INTERLOCK_OPEN_MS = 60_000;
/** A killed server is back after this. */
export const SERVER_AWAY_MS = 5_000;

export interface FaultTargets {
  clock: Clock;
  controller: RehearsalController;
  killServer(): void;
}

const raise = {
  'link-drop': ({ controller }: FaultTargets) => controller.dropLine(LINK_DROP_MS),
  garbage: ({ controller }: FaultTargets) => controller.garbage(GARBAGE_MS),
  'server-kill': ({ killServer }: FaultTargets) => killServer(),
  'controller-reset': ({ controller }: FaultTargets) => controller.reset(),
  'interlock-open': ({ controller, clock }: FaultTargets) => {
    controller.openInterlock();
    clock.after(INTERLOCK_OPEN_MS, () => controller.closeInterlock());
  },
} as const;
export type FaultKind = keyof typeof raise;

export const faultKinds = Object.keys(raise) as readonly FaultKind[];
/** In the format, and refused until channels and the judgement of dwells can answer them. */
export const faultKindsNotYet: readonly string[] = ['sensor-gap', 'burst'];

export const isFaultKind = (kind: string): kind is FaultKind => (faultKinds as readonly string[]).includes(kind);

/** Raises each fault `atS` seconds of simulated time from now. */
export function scheduleFaults(faults: readonly { kind: string; atS: number }[], targets: FaultTargets): void {
  for (const { kind, atS } of faults) {
    if (!isFaultKind(kind)) throw new Error(`${kind} is no fault that a rehearsal can raise`);
    targets.clock.after(1000 * atS, () => raise[kind](targets));
  }
}
