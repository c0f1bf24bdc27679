import type { Clock } from '../interfaces/clock';

interface Bucket {
  batches: number;
  samples: number;
  atMs: number;
}

/** Of one device token. */
export interface AppendLimits {
  batchesPerMinute: number;
  samplesPerMinute: number;
}

/** More tokens than this are not remembered at once: whoever sent longest ago is forgotten. */
const MOST_BUCKETS = 10_000;

/**
 * How much each device may append: a bucket of batches and one of samples, each of a minute's worth, that fill up evenly. A device that was
 * away may send what it kept at once, up to a minute's worth.
 */
export class AppendRates {
  private readonly buckets = new Map<string, Bucket>();

  constructor(
    private readonly clock: Clock,
    private readonly limits: () => AppendLimits,
  ) {}

  /** Takes a batch out; seconds to wait where there is not enough left, and nothing is taken. */
  take(tokenId: string, samples: number): { ok: true } | { ok: false; retryAfterS: number } {
    const limits = this.limits();
    const bucket = this.filled(tokenId, limits);
    const lack = Math.max(
      (1 - bucket.batches) / limits.batchesPerMinute,
      (Math.min(samples, limits.samplesPerMinute) - bucket.samples) / limits.samplesPerMinute,
    );
    if (lack > 0) return { ok: false, retryAfterS: lack * 60 };
    bucket.batches -= 1;
    bucket.samples -= samples;
    return { ok: true };
  }

  private filled(tokenId: string, limits: AppendLimits): Bucket {
    const nowMs = this.clock.monotonicMs();
    const known = this.buckets.get(tokenId);
    const share = known === undefined ? 1 : (nowMs - known.atMs) / 60_000;
    const bucket = {
      batches: Math.min(limits.batchesPerMinute, (known?.batches ?? 0) + share * limits.batchesPerMinute),
      samples: Math.min(limits.samplesPerMinute, (known?.samples ?? 0) + share * limits.samplesPerMinute),
      atMs: nowMs,
    };
    this.buckets.delete(tokenId);
    this.buckets.set(tokenId, bucket);
    const [oldest] = this.buckets.keys();
    if (this.buckets.size > MOST_BUCKETS && oldest !== undefined) this.buckets.delete(oldest);
    return bucket;
  }
}
