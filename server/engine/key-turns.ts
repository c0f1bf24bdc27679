import type { Clock } from '../interfaces/clock';
import type { LinkEvent } from '../interfaces/turntable-link';

/** How long a turn of the arm key shows that somebody stands at the rig. */
const keyTurnCountsMs = 120_000;

/** A turn of the arm key, either way. */
export interface KeyTurn {
  /** By the controller's own stamp. */
  utcMs: number;
  /** When it was heard, by the server's monotonic clock, ms. */
  heardMs: number;
}

/** When the arm key of each rig was last turned: the only thing that shows from afar that somebody is at the rig. */
export class KeyTurns {
  private readonly turns = new Map<string, KeyTurn>();

  constructor(private readonly clock: Pick<Clock, 'monotonicMs'>) {}

  /** What the link of a rig told. */
  heard(rigId: string, event: LinkEvent): void {
    if (event.kind === 'arm-key') this.turns.set(rigId, { utcMs: event.at.utcMs, heardMs: this.clock.monotonicMs() });
    // A controller that starts anew has seen no hand turn the key.
    if (event.kind === 'reset' || event.kind === 'lost') this.turns.delete(rigId);
  }

  /** A turn of the last 2 min that was made after an instant, UTC ms; null where there was none. It shows the presence of one person, once: whoever takes it has it alone. */
  take(rigId: string, afterUtcMs: number): KeyTurn | null {
    const turn = this.turns.get(rigId);
    if (turn === undefined || turn.utcMs <= afterUtcMs || this.clock.monotonicMs() - turn.heardMs > keyTurnCountsMs) return null;
    this.turns.delete(rigId);
    return turn;
  }

  /** What it was taken for did not come about. */
  giveBack(rigId: string, turn: KeyTurn): void {
    if (!this.turns.has(rigId)) this.turns.set(rigId, turn);
  }
}
