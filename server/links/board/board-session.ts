import type { BootCause } from '@/firmware-protocol/codec';
import { CYCLES_PER_US } from './avr-core';
import { type BoardInput, type BoardListeners, type BoardOptions, EmulatedBoard } from './emulated-board';

export type BoardDeed =
  { kind: 'input'; input: BoardInput; on: boolean } | { kind: 'reset'; cause: BootCause } | { kind: 'slip'; steps: number };

/** A line that the board sent, without its line feed, and when that had arrived, ms of the host's monotonic time. */
export interface BoardLine {
  text: string;
  atMs: number;
}

export interface SessionOptions extends BoardOptions {
  /** Rate error of the board's crystal, parts per million; default 18. */
  ratePpm?: number;
}

const DEFAULT_RATE_PPM = 18;
/** SPEC 4.2: an answer comes within 50 ms; then its own time on the wire. */
const ANSWER_WITHIN_MS = 60;
const STRIDE_MS = 1;

/**
 * The board on the time of a host: it is told what the host does when, and tells which lines arrive when. At rest it lags
 * behind and is brought up to each deed; after a request it runs ahead until its reply is out, so that the reply can be handed over
 * at its own time. What the host does meanwhile reaches it a few ms late, as through a serial adapter that buffers.
 */
export class BoardSession {
  readonly board: EmulatedBoard;
  private readonly lines: BoardLine[] = [];
  private readonly cyclesPerMs: number;
  private text = '';
  /** The cycle at which the last byte that was written has arrived. */
  lastArrivedCycle = 0;
  private born = { ms: 0, cycle: 0 };

  constructor({ ratePpm = DEFAULT_RATE_PPM, ...options }: SessionOptions, listeners: Pick<BoardListeners, 'onEdge'> = {}) {
    this.cyclesPerMs = 1000 * CYCLES_PER_US * (1 + ratePpm * 1e-6);
    this.board = new EmulatedBoard(options, { ...listeners, onByte: (byte, cycle) => this.hear(byte, cycle) });
  }

  /** From here on the board's present is this instant of the host. */
  begin(atMs: number): void {
    this.born = { ms: atMs, cycle: this.board.cycle };
    this.lines.length = 0;
  }

  /** Bytes that the host begins to write. */
  write(bytes: string, atMs: number): BoardLine[] {
    this.board.runTo(this.cycleAt(atMs));
    this.lastArrivedCycle = this.board.send(bytes);
    return bytes.trim() === '' ? this.told() : this.untilAnswer(this.lastArrivedCycle);
  }

  do(deed: BoardDeed, atMs: number): BoardLine[] {
    this.board.runTo(this.cycleAt(atMs));
    if (deed.kind === 'input') this.board.setInput(deed.input, deed.on);
    else if (deed.kind === 'reset') this.board.reset(deed.cause);
    else this.board.slip(deed.steps);
    return this.told();
  }

  advance(toMs: number): BoardLine[] {
    this.board.runTo(this.cycleAt(toMs));
    return this.told();
  }

  /** Where the table truly was, microsteps from the home edge. */
  placeAt(ms: number): number {
    return this.board.table.track.at(this.cycleAt(ms));
  }

  msAt(cycle: number): number {
    return this.born.ms + (cycle - this.born.cycle) / this.cyclesPerMs;
  }

  private cycleAt(ms: number): number {
    return this.born.cycle + (ms - this.born.ms) * this.cyclesPerMs;
  }

  private untilAnswer(arrived: number): BoardLine[] {
    const end = arrived + ANSWER_WITHIN_MS * this.cyclesPerMs;
    const answered = () => this.lines.some(({ text }) => text.startsWith('r '));
    while (!answered() && this.board.cycle < end) this.board.runTo(this.board.cycle + STRIDE_MS * this.cyclesPerMs);
    return this.told();
  }

  private told(): BoardLine[] {
    return this.lines.splice(0);
  }

  private hear(byte: number, cycle: number): void {
    if (byte !== 0x0a) {
      this.text += String.fromCharCode(byte);
      return;
    }
    this.lines.push({ text: this.text, atMs: this.msAt(cycle) });
    this.text = '';
  }
}
