import type { SampleReader } from '@/server/interfaces/sample-reader';
import { type Bench, startUtcMs } from './rig-bench';

export interface Signal {
  name: string;
  unit: string;
  /** Value at an instant, s after the start; null: no sample. */
  at: (tS: number) => number | null;
}

/** A reader of signals that are functions of time, sampled twice a second up to now. */
export function readerOf(bench: () => Bench, signals: readonly Signal[]): SampleReader {
  return {
    deflection: () => (signals.some(({ name }) => name === 'deflection') ? 'deflection' : null),
    read: (channel, { fromUtcMs, toUtcMs }) => {
      const signal = signals.find(({ name }) => name === channel);
      if (signal === undefined) return null;
      const untilUtcMs = Math.min(toUtcMs, bench().clock.utcMs());
      const found: [number, number][] = [];
      for (let at = Math.ceil(fromUtcMs / 500) * 500; at <= untilUtcMs; at += 500) {
        const value = signal.at((at - startUtcMs) / 1000);
        if (value !== null) found.push([at, value]);
      }
      return { unit: signal.unit, rateHz: 2, utcMs: Float64Array.from(found, ([at]) => at), value: Float64Array.from(found, ([, v]) => v) };
    },
  };
}
