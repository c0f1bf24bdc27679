import { ApiProblem } from '@/components/api/problem';
import {
  bufferAfter,
  emptyBuffer,
  linesOf,
  type BufferEvent,
  type BufferLimits,
  type SpotBuffer,
  type SpotSample,
} from '@/shared/spot/buffer';

export interface SpotTarget {
  channel: string;
  token: string;
}

export interface SenderParts {
  /** Hands a batch to the server. Rejects where it was not stored, or no answer came. */
  send(target: SpotTarget, lines: string): Promise<void>;
  nowMs(): number;
  limits?: BufferLimits;
}

export interface SenderState {
  buffer: SpotBuffer;
  /** Why the last batch was not stored; null while all goes well. */
  trouble: string | null;
  /** Why a batch was thrown away. */
  refused: string | null;
}

/** Between two batches, and after failures one after the other, ms. */
const everyMs = 1000;
const pausesMs = [2000, 5000, 10_000, 30_000];

/** A batch that the server will never take as it is. */
const isHopeless = (error: unknown) => error instanceof ApiProblem && (error.code === 'unreadable-data' || error.code === 'too-large');

/** Brings samples to the server: a batch at a time, the same one again until it is stored. */
export class SpotSender {
  private state: SenderState = { buffer: emptyBuffer, trouble: null, refused: null };
  private dueMs = 0;
  private failures = 0;

  constructor(private readonly parts: SenderParts) {}

  get now(): SenderState {
    return this.state;
  }

  take(sample: SpotSample): void {
    this.after({ type: 'measured', sample });
  }

  /** Sends what is there, where it is time for that. To be called often. */
  async step(target: SpotTarget): Promise<void> {
    if (target.token === '' || target.channel === '' || this.parts.nowMs() < this.dueMs) return;
    this.after({ type: 'send' });
    const batch = this.state.buffer.underWay;
    if (batch === null) return;
    // Until it is answered.
    this.dueMs = Infinity;
    try {
      await this.parts.send(target, linesOf(target.channel, batch));
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
