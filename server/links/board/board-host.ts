import type { Clock } from '../../interfaces/clock';
import type { BoardDeed, BoardLine, BoardSession } from './board-session';

/** A board with its table, wherever it runs. Times are ms of the host's monotonic clock. */
export interface BoardHost {
  /** Set by whoever speaks to it: a line is to be handed over at its time. */
  onLine: (line: BoardLine) => void;
  write(bytes: string): void;
  do(deed: BoardDeed): void;
  /** Where the table truly was, microsteps from the home edge; the present and the past. */
  placeAt(ms: number): number;
}

/** How far the board may lag behind its host while nobody speaks to it: events are handed over so late, their stamps are right. */
const PACE_MS = 20;

/** A board in this thread, on a clock that is virtual or real. */
export class LocalBoardHost implements BoardHost {
  onLine: (line: BoardLine) => void = () => undefined;

  private readonly onPace: () => void;

  /** `onPace`: the board was brought up to the present. `presentMs`: the instant that its present is, before it catches up; default: now. */
  constructor(
    private readonly clock: Clock,
    private readonly session: BoardSession,
    { onPace = () => undefined, presentMs = clock.monotonicMs() }: { onPace?: () => void; presentMs?: number } = {},
  ) {
    this.onPace = onPace;
    session.begin(presentMs);
    this.pace();
  }

  /** `atMs`: when the host began to write; `beforeTelling`: done before what the board answers is handed over. */
  write(bytes: string, { atMs = this.clock.monotonicMs(), beforeTelling }: { atMs?: number; beforeTelling?: () => void } = {}): void {
    const lines = this.session.write(bytes, atMs);
    beforeTelling?.();
    this.tell(lines);
  }

  do(deed: BoardDeed, beforeTelling?: () => void): void {
    const lines = this.session.do(deed, this.clock.monotonicMs());
    beforeTelling?.();
    this.tell(lines);
  }

  placeAt(ms: number): number {
    this.tell(this.session.advance(Math.min(ms, this.clock.monotonicMs())));
    return this.session.placeAt(ms);
  }

  private pace(): void {
    this.clock.after(PACE_MS, () => {
      this.tell(this.session.advance(this.clock.monotonicMs()));
      this.onPace();
      this.pace();
    });
  }

  private tell(lines: readonly BoardLine[]): void {
    for (const line of lines) this.onLine(line);
  }
}
