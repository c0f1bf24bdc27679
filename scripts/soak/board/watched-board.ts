import { decodeLine } from '@/firmware-protocol/codec';
import { CPU_HZ } from '@/server/links/board/avr-core';
import { commissionedSession, controllerOn } from '@/server/links/board/board-controller';
import { COMMISSION_TAGS } from '@/server/links/board/commission';
import { type BoardHost, LocalBoardHost } from '@/server/links/board/board-host';
import type { BoardLine, BoardSession } from '@/server/links/board/board-session';
import type { Edge } from '@/server/links/board/emulated-board';
import { limitsOf, stepsOfDeg } from '@/server/links/rig-units';
import type { Clock } from '@/server/interfaces/clock';
import type { SimulatedController } from '@/server/links/simulated-controller';
import type { RigMotion } from '@/shared/rig/document';

const LEASE_MS = 2_000;
/** The board runs ahead of its host by an answer, and lags behind it by a pace (see `BoardSession`). */
const LAG_MS = 100;
/** Rounding of an interval to ticks of the timer, cycles. */
const JITTER_CYCLES = 32;
/** A board's crystal runs at any rate within 0.1 %. */
const RATE_SPARE = 1.001;
const KEPT_VIOLATIONS = 20;

/** Steps with a longer pause between them belong to two motions, ms: the slowest first interval of a ramp is shorter. */
const PAUSE_MS = 250;

/** The emulated board behind a production link, with what must always hold looked at from outside: at its pins and on its line. */
export class WatchedBoard {
  readonly controller: SimulatedController;
  readonly violations: string[] = [];
  /** First and last step of each motion as the pin made them, ms of the clock's UTC. */
  readonly motions: { firstUtcMs: number; lastUtcMs: number }[] = [];
  steps = 0;
  lines = 0;
  private readonly session: BoardSession;
  private readonly least: number;
  private readonly greatest: number;
  private readonly shortestCycles: number;
  private readonly rampMs: number;
  private readonly renewedMs: number[] = [];
  private readonly began = new Set<string>();
  private readonly heard = new Set<number>();
  private watching = false;
  private lastStep: { cycle: number; direction: boolean } = { cycle: -Infinity, direction: false };

  constructor(
    private readonly clock: Clock,
    { rig, seed }: { rig: RigMotion; seed: number },
  ) {
    const limits = limitsOf(rig);
    [this.least, this.greatest] = [limits.least, limits.greatest];
    this.shortestCycles = CPU_HZ / (limits.speed / 1000) - JITTER_CYCLES;
    this.rampMs = (1000 * limits.speed) / limits.acceleration;
    this.session = commissionedSession(
      { rig, homed: true, startSteps: stepsOfDeg(rig, rig.homeDeg) },
      { seed },
      { onEdge: (edge) => this.seeEdge(edge) },
    );
    const inner = new LocalBoardHost(clock, this.session);
    this.watching = true;
    const host: BoardHost = {
      onLine: () => undefined,
      write: (bytes) => {
        this.seeRequest(bytes);
        inner.write(bytes);
      },
      do: (deed) => inner.do(deed),
      placeAt: (ms) => inner.placeAt(ms),
    };
    inner.onLine = (line) => {
      this.seeLine(line);
      host.onLine(line);
    };
    this.controller = controllerOn(host, { clock, rig, seed });
  }

  note(words: string): void {
    if (this.violations.length < KEPT_VIOLATIONS) this.violations.push(words);
  }

  private seeRequest(bytes: string): void {
    const item = decodeLine(bytes.trim());
    if (item.kind === 'request' && item.order.word === 'renew') this.renewedMs.push(this.clock.monotonicMs());
  }

  private seeLine({ text, atMs }: BoardLine): void {
    this.lines += 1;
    const item = decodeLine(text);
    if (item.kind !== 'event' || this.heard.has(item.number)) return;
    this.heard.add(item.number);
    const { what } = item;
    if (what.word !== 'began' && what.word !== 'ended') return;
    // Made before anybody watched, and told again from the ring.
    if (COMMISSION_TAGS.some((tag) => tag === what.tag)) return;
    if (what.word === 'began') {
      if (this.began.has(what.tag)) this.note(`the motion ${what.tag} began twice`);
      this.began.add(what.tag);
    } else if (what.position !== this.session.placeAt(atMs)) {
      this.note(`the end of ${what.tag} was told at ${what.position}, the table stands at ${this.session.placeAt(atMs)}`);
    }
  }

  private seeEdge({ pin, level, cycle }: Edge): void {
    if (!this.watching || pin !== 'step' || !level) return;
    this.steps += 1;
    const { board } = this.session;
    const atMs = this.session.msAt(cycle);
    const direction = board.output('direction');
    const next = board.table.track.at(Infinity) + (direction ? 1 : -1);
    if (next < this.least || next > this.greatest) this.note(`at ${atMs} ms a step led to ${next}, beyond the limits`);
    const { lastStep } = this;
    if (direction === lastStep.direction && (cycle - lastStep.cycle) * RATE_SPARE < this.shortestCycles)
      this.note(`at ${atMs} ms a step came ${cycle - lastStep.cycle} cycles after the one before`);
    this.lastStep = { cycle, direction };
    const utcMs = this.clock.utcMs() - this.clock.monotonicMs() + atMs;
    const motion = this.motions.at(-1);
    if (motion === undefined || utcMs - motion.lastUtcMs > PAUSE_MS) this.motions.push({ firstUtcMs: utcMs, lastUtcMs: utcMs });
    else motion.lastUtcMs = utcMs;
    const renewedMs = this.renewedMs.findLast((ms) => ms <= atMs + LAG_MS) ?? -Infinity;
    if (atMs > renewedMs + LEASE_MS + this.rampMs + LAG_MS)
      this.note(`at ${atMs} ms a step came ${atMs - renewedMs} ms after the last renewal`);
  }
}
