import type { Clock } from '@/server/interfaces/clock';
import type { SampleReader } from '@/server/interfaces/sample-reader';

/** The thermometer of the room as a device sends it, once a second: it can fall silent, and the room can be warm for a while. */
export class Room {
  private silentUntilMs = -Infinity;
  private silentFromMs = -Infinity;
  private warmUntilMs = -Infinity;
  private warmFromMs = -Infinity;

  constructor(private readonly clock: Clock) {}

  /** The fault `sensor-gap`. */
  fallSilent(ms: number): void {
    this.silentFromMs = this.clock.utcMs();
    this.silentUntilMs = this.silentFromMs + ms;
  }

  /** The fault `burst`. */
  warmUp(ms: number): void {
    this.warmFromMs = this.clock.utcMs();
    this.warmUntilMs = this.warmFromMs + ms;
  }

  readonly reader: SampleReader = {
    deflection: () => null,
    read: (channel, { fromUtcMs, toUtcMs }) => {
      if (channel !== 'box temperature') return null;
      const samples: [number, number][] = [];
      for (let at = Math.ceil(fromUtcMs / 1000) * 1000; at <= Math.min(toUtcMs, this.clock.utcMs()); at += 1000)
        if (at < this.silentFromMs || at >= this.silentUntilMs)
          samples.push([at, at >= this.warmFromMs && at < this.warmUntilMs ? 35 : 20]);
      return { unit: 'degC', rateHz: 1, utcMs: Float64Array.from(samples, ([at]) => at), value: Float64Array.from(samples, ([, v]) => v) };
    },
  };
}
