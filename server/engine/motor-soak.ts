import type { ControllerState } from '../interfaces/turntable-link';

interface On {
  bootId: string;
  sinceUtcMs: number;
}

/**
 * Since when the motor of each rig carries its current, as far as this process has seen: its heat shifts the room side of the apparatus for hours,
 * so dwells measured soon after drift. What was on before this process listened counts from then.
 */
export class MotorSoak {
  private readonly on = new Map<string, On>();

  /** Told whenever the line has told something; null while nothing answers, which says nothing of the motor. */
  note(rigId: string, controller: Pick<ControllerState, 'bootId' | 'driversOn'> | null, utcMs: number): void {
    if (controller === null) return;
    const { bootId, driversOn } = controller;
    const known = this.on.get(rigId);
    if (!driversOn) this.on.delete(rigId);
    else if (known?.bootId !== bootId) this.on.set(rigId, { bootId, sinceUtcMs: utcMs });
  }

  /** Null: it is off. */
  sinceUtcMs(rigId: string): number | null {
    return this.on.get(rigId)?.sinceUtcMs ?? null;
  }
}
