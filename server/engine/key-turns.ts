import type { LinkEvent } from '../interfaces/turntable-link';

/** How long a turn of the arm key shows that somebody stands at the rig. */
export const keyTurnCountsMs = 120_000;

/** When the arm key of each rig was last turned, either way: the only thing that shows from afar that somebody is at the rig. */
export class KeyTurns {
  private readonly turnedUtcMs = new Map<string, number>();

  /** What the link of a rig told; a turn counts from the controller's own stamp of it. */
  heard(rigId: string, event: LinkEvent): void {
    if (event.kind === 'arm-key') this.turnedUtcMs.set(rigId, event.at.utcMs);
    // A controller that starts anew has seen no hand turn the key.
    if (event.kind === 'reset' || event.kind === 'lost') this.turnedUtcMs.delete(rigId);
  }

  /** Whether the key was turned within the last 2 min. */
  turnedLately(rigId: string, nowUtcMs: number): boolean {
    const turnedUtcMs = this.turnedUtcMs.get(rigId);
    return turnedUtcMs !== undefined && Math.abs(nowUtcMs - turnedUtcMs) <= keyTurnCountsMs;
  }

  /** A turn shows the presence of one person, once. */
  spend(rigId: string): void {
    this.turnedUtcMs.delete(rigId);
  }
}
