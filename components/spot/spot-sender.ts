import { ApiProblem } from '@/components/api/problem';
import {
  bufferAfter,
  countOf,
  emptyBuffer,
  heldPieces,
  linesOf,
  type BufferEvent,
  type BufferLimits,
  type SpotBuffer,
  type SpotSample,
} from '@/shared/spot/buffer';
import { changeFrom, type PieceKeep } from './kept-pieces';

export interface SpotTarget {
  channel: string;
  token: string;
}

export interface SenderParts {
  /** Hands a batch to the server. Rejects where it was not stored, or no answer came. */
  send(target: SpotTarget, lines: string): Promise<void>;
  keep: PieceKeep;
  /** Id of the first piece: greater than those of every page before. */
  firstId: number;
  nowMs(): number;
  limits?: BufferLimits;
}

export interface SenderState {
  buffer: SpotBuffer;
  /** Samples that a page before this one left on the device. */
  found: number;
  /** Samples that lie on the device by now. */
  kept: number;
  /** Why the device keeps nothing, so that what waits is lost with the page; null while it does. */
  unkept: string | null;
  /** Why the last batch was not stored; null while all goes well. */
  trouble: string | null;
  /** Why a batch was thrown away. */
  refused: string | null;
}

/** Between two batches, and after failures one after the other, ms. */
const everyMs = 1000;
const pausesMs = [2000, 5000, 10_000, 30_000];
/** How often what waits is brought to the device, and after the device refused it, ms. */
const keepMs = 1000;
const keepAgainMs = 30_000;

/** A batch that the server will never take as it is. */
const isHopeless = (error: unknown) => error instanceof ApiProblem && (error.code === 'unreadable-data' || error.code === 'too-large');

/**
 * Brings samples to the server: a batch at a time, the same one again until it is stored. What waits lies on the device too; a page that is opened
 * later goes on with it. A sample is known to the server by channel and instant, so one that is sent twice is stored once.
 */
export class SpotSender {
  private state: SenderState;
  private dueMs = 0;
  private failures = 0;
  private begun: Promise<void> | null = null;
  private keepDueMs = 0;
  /** Samples on the device by the id of their piece. */
  private kept = new Map<number, number>();

  constructor(private readonly parts: SenderParts) {
    this.state = { buffer: emptyBuffer(parts.firstId), found: 0, kept: 0, unkept: null, trouble: null, refused: null };
  }

  get now(): SenderState {
    return this.state;
  }

  take(channel: string, sample: SpotSample): void {
    this.after({ type: 'measured', channel, sample });
  }

  /** Keeps and sends what is there, where it is time for that. To be called often. */
  async step(target: SpotTarget): Promise<void> {
    await (this.begun ??= this.takeUp());
    await Promise.all([this.parts.nowMs() < this.keepDueMs ? null : this.keepUp(), this.send(target)]);
  }

  /** Brings all that waits to the device now. */
  async keepUp(): Promise<void> {
    const held = heldPieces(this.state.buffer);
    const change = changeFrom(this.kept, held);
    this.keepDueMs = Infinity;
    try {
      if (change.put.length > 0 || change.remove.length > 0) await this.parts.keep.change(change);
      this.kept = new Map(held.map(({ id, samples }) => [id, samples.length]));
      this.state = { ...this.state, kept: countOf(held), unkept: null };
      this.keepDueMs = this.parts.nowMs() + keepMs;
    } catch (error) {
      this.notKept(error);
    }
  }

  /** Goes on with what a page before this one left. */
  private async takeUp(): Promise<void> {
    try {
      const pieces = await this.parts.keep.load();
      this.kept = new Map(pieces.map(({ id, samples }) => [id, samples.length]));
      this.after({ type: 'found', pieces }, { found: countOf(pieces), kept: countOf(pieces) });
    } catch (error) {
      this.notKept(error);
    }
  }

  private notKept(error: unknown): void {
    this.state = { ...this.state, unkept: error instanceof Error && error.message !== '' ? error.message : String(error) };
    this.keepDueMs = this.parts.nowMs() + keepAgainMs;
  }

  private async send(target: SpotTarget): Promise<void> {
    if (target.token === '' || target.channel === '' || this.parts.nowMs() < this.dueMs) return;
    this.after({ type: 'send', channel: target.channel });
    const batch = this.state.buffer.underWay;
    if (batch === null) return;
    // Until it is answered.
    this.dueMs = Infinity;
    try {
      await this.parts.send(target, linesOf(batch));
      this.failures = 0;
      this.after({ type: 'stored' }, { trouble: null });
      this.dueMs = this.parts.nowMs() + everyMs;
    } catch (error) {
      this.failed(error);
    }
  }

  private failed(error: unknown): void {
    const words = error instanceof ApiProblem ? error.detail : 'The server does not answer.';
    if (isHopeless(error)) this.after({ type: 'refused' }, { refused: words });
    else this.state = { ...this.state, trouble: words };
    this.dueMs = this.parts.nowMs() + (pausesMs[Math.min(this.failures, pausesMs.length - 1)] ?? everyMs);
    this.failures += 1;
  }

  private after(event: BufferEvent, also: Partial<SenderState> = {}): void {
    this.state = { ...this.state, ...also, buffer: bufferAfter(this.state.buffer, event, this.parts.limits) };
  }
}
