import type { Logger } from 'pino';
import type { Clock } from '../interfaces/clock';
import type { SampleBatch, SampleStore } from '../interfaces/sample-store';

/** Batches kept while the database is away: an hour of one a second. */
const mostKept = 3600;

/** Stores batches of one channel in their order; what cannot be stored now is kept and tried with the next. */
export class SampleSink {
  private waiting: SampleBatch[] = [];
  private atWork: Promise<void> | null = null;
  private dropped = 0;
  private storedMs = -Infinity;

  constructor(
    private readonly parts: { samples: SampleStore; clock: Clock; log: Logger; /** Stores at most this often, ms. */ paceMs: number },
    private readonly channel: { labId: string; channelId: string },
  ) {}

  add(batch: SampleBatch): void {
    if (batch.utcMs.length === 0) return;
    this.waiting.push(batch);
    if (this.waiting.length > mostKept) {
      this.waiting.shift();
      this.dropped += 1;
    }
    if (this.parts.clock.monotonicMs() - this.storedMs < this.parts.paceMs) return;
    this.atWork ??= this.store();
  }

  /** Stores what is left, before the sink is given up. */
  async flush(): Promise<void> {
    await this.atWork;
    await this.store();
  }

  async idle(): Promise<void> {
    await this.atWork;
  }

  private async store(): Promise<void> {
    const { samples, clock, log } = this.parts;
    this.storedMs = clock.monotonicMs();
    try {
      while (this.waiting.length > 0) {
        const taken = this.waiting;
        this.waiting = [];
        try {
          await samples.append(this.channel.labId, this.channel.channelId, joined(taken));
        } catch (error) {
          this.waiting = [...taken, ...this.waiting];
          throw error;
        }
      }
      if (this.dropped > 0) log.error({ ...this.channel, batches: this.dropped }, 'samples were lost while the database was away');
      this.dropped = 0;
    } catch (error) {
      log.warn({ err: error, ...this.channel, batches: this.waiting.length }, 'samples are not stored yet');
    } finally {
      this.atWork = null;
    }
  }
}

function joined(batches: readonly SampleBatch[]): SampleBatch {
  const [only] = batches;
  if (batches.length === 1 && only !== undefined) return only;
  const length = batches.reduce((sum, batch) => sum + batch.utcMs.length, 0);
  const whole = { utcMs: new Float64Array(length), value: new Float64Array(length) };
  let at = 0;
  for (const batch of batches) {
    whole.utcMs.set(batch.utcMs, at);
    whole.value.set(batch.value, at);
    at += batch.utcMs.length;
  }
  return whole;
}
