import type { Series } from '@/shared/conditions/series';
import type { SampleReader } from '../interfaces/sample-reader';
import type { SampleBatch } from '../interfaces/sample-store';

export interface ChannelFacts {
  name: string;
  unit: string;
  role: 'deflection' | 'environment' | 'turntable';
  rateHz: number | null;
}

/** As long as a settle waits if nothing else is said (4 h), and at most so many samples of a channel. */
export const KEPT_MS = 4 * 3_600_000;
const MOST_KEPT = 400_000;

/** The last hours of every channel that is being filled, in memory: conditions of runs are looked up here. */
export class RecentSamples {
  private readonly rigs = new Map<string, Map<string, RecentChannel>>();

  add(rigId: string, facts: ChannelFacts, batch: SampleBatch): void {
    const channels = this.rigs.get(rigId) ?? new Map<string, RecentChannel>();
    this.rigs.set(rigId, channels);
    const known = channels.get(facts.name);
    const channel = known?.fits(facts) === true ? known : new RecentChannel(facts);
    channels.set(facts.name, channel);
    channel.add(batch);
  }

  /** All that runs on a rig may read. */
  readerOf(rigId: string): SampleReader {
    return {
      deflection: (wanted) => this.deflectionOf(rigId, wanted),
      read: (channel, window) => this.rigs.get(rigId)?.get(channel)?.read(window) ?? null,
    };
  }

  private deflectionOf(rigId: string, wanted: string | undefined): string | null {
    const channels = this.rigs.get(rigId);
    if (channels === undefined) return null;
    if (wanted !== undefined && channels.has(wanted)) return wanted;
    const all = [...channels.values()].filter(({ facts }) => facts.role === 'deflection');
    return all.length === 1 ? (all[0]?.facts.name ?? null) : null;
  }
}

/** One channel: appended at the end as a rule; what comes late is put where it belongs. */
class RecentChannel {
  private utcMs: number[] = [];
  private value: number[] = [];

  constructor(readonly facts: ChannelFacts) {}

  fits({ unit, role }: ChannelFacts): boolean {
    return unit === this.facts.unit && role === this.facts.role;
  }

  add(batch: SampleBatch): void {
    for (let index = 0; index < batch.utcMs.length; index += 1) this.put(batch.utcMs[index] as number, batch.value[index] as number);
    this.forget();
  }

  read({ fromUtcMs, toUtcMs }: { fromUtcMs: number; toUtcMs: number }): Series {
    const from = this.firstAt(fromUtcMs);
    const to = this.firstAt(toUtcMs + 1e-6);
    const { unit, rateHz } = this.facts;
    return {
      ...{ unit, rateHz },
      utcMs: Float64Array.from(this.utcMs.slice(from, to)),
      value: Float64Array.from(this.value.slice(from, to)),
    };
  }

  private put(utcMs: number, value: number): void {
    const last = this.utcMs.at(-1) ?? -Infinity;
    if (utcMs > last) {
      this.utcMs.push(utcMs);
      this.value.push(value);
      return;
    }
    const index = this.firstAt(utcMs);
    if (this.utcMs[index] === utcMs) return;
    this.utcMs.splice(index, 0, utcMs);
    this.value.splice(index, 0, value);
  }

  /** Now and then, a tenth at once: to move all that is left for each batch would cost more than it saves. */
  private forget(): void {
    const last = this.utcMs.at(-1) ?? 0;
    const old = Math.max(this.firstAt(last - KEPT_MS), this.utcMs.length - MOST_KEPT);
    if (old < Math.max(1000, this.utcMs.length / 10)) return;
    this.utcMs = this.utcMs.slice(old);
    this.value = this.value.slice(old);
  }

  /** Index of the first sample at or after an instant. */
  private firstAt(utcMs: number): number {
    let [low, high] = [0, this.utcMs.length];
    while (low < high) {
      const middle = (low + high) >> 1;
      if ((this.utcMs[middle] as number) < utcMs) low = middle + 1;
      else high = middle;
    }
    return low;
  }
}
