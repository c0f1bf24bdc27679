import type { ChannelSeries } from '@/shared/archive/run-records';
import type { SampleReader } from '../../interfaces/sample-reader';
import type { SampleBatch } from '../../interfaces/sample-store';

/** The deflection channel of a rehearsal: batches in, one series out, in arrays that double as they fill. */
export class DeflectionSeries {
  private utcMs = new Float64Array(1 << 16);
  private value = new Float64Array(1 << 16);
  private length = 0;

  append(batch: SampleBatch): void {
    this.reserve(this.length + batch.utcMs.length);
    this.utcMs.set(batch.utcMs, this.length);
    this.value.set(batch.value, this.length);
    this.length += batch.utcMs.length;
  }

  series(): ChannelSeries {
    return {
      info: { name: 'deflection', quantity: 'pendulum angle', unit: 'rad', role: 'deflection' },
      utcMs: this.utcMs.slice(0, this.length),
      value: this.value.slice(0, this.length),
    };
  }

  /** What the run can look at while it goes on. */
  readonly reader: SampleReader = {
    deflection: () => (this.length === 0 ? null : 'deflection'),
    read: (channel, { fromUtcMs, toUtcMs }) => {
      if (channel !== 'deflection') return null;
      const [from, to] = [this.firstAt(fromUtcMs), this.firstAt(toUtcMs + 1e-6)];
      return { unit: 'rad', rateHz: null, utcMs: this.utcMs.slice(from, to), value: this.value.slice(from, to) };
    },
  };

  private firstAt(utcMs: number): number {
    let [low, high] = [0, this.length];
    while (low < high) {
      const middle = (low + high) >> 1;
      if ((this.utcMs[middle] as number) < utcMs) low = middle + 1;
      else high = middle;
    }
    return low;
  }

  private reserve(length: number): void {
    while (this.utcMs.length < length) {
      this.utcMs = doubled(this.utcMs);
      this.value = doubled(this.value);
    }
  }
}

function doubled(array: Float64Array<ArrayBuffer>): Float64Array<ArrayBuffer> {
  const larger = new Float64Array(2 * array.length);
  larger.set(array);
  return larger;
}
