import type { SampleBatch } from '../../interfaces/sample-store';

const BURST_RAD = 200e-6;
/** Of the shaking in a burst, s: a building sways at some tenths of a hertz (an estimate, no source). */
const SHAKING_PERIOD_S = 7;

interface Window {
  fromUtcMs: number;
  toUtcMs: number;
}

/** What spoils the deflection of a rehearsal on its way into the channel; the pendulum itself goes on as it does. */
export class ReadoutFaults {
  private readonly gaps: Window[] = [];
  private readonly bursts: Window[] = [];

  /** No samples in this window: the sensor is dead, the beam is blocked. */
  addGap(window: Window): void {
    this.gaps.push(window);
  }

  /** Somebody shakes the readout: 200 µrad at the height of it. */
  addBurst(window: Window): void {
    this.bursts.push(window);
  }

  /** The samples that still come, as they come. */
  spoil({ utcMs, value }: SampleBatch): SampleBatch {
    if (this.gaps.length === 0 && this.bursts.length === 0) return { utcMs, value };
    const kept = [...utcMs.keys()].filter((index) => !this.gaps.some((gap) => isWithin(gap, utcMs[index] as number)));
    const at = Float64Array.from(kept, (index) => utcMs[index] as number);
    return { utcMs: at, value: at.map((ms, index) => (value[kept[index] as number] as number) + this.burstRad(ms)) };
  }

  private burstRad(utcMs: number): number {
    return this.bursts.reduce((sum, burst) => sum + (isWithin(burst, utcMs) ? shaking(burst, utcMs) : 0), 0);
  }
}

const isWithin = ({ fromUtcMs, toUtcMs }: Window, utcMs: number) => utcMs >= fromUtcMs && utcMs < toUtcMs;

function shaking({ fromUtcMs, toUtcMs }: Window, utcMs: number): number {
  const sinceS = (utcMs - fromUtcMs) / 1000;
  const envelope = Math.sin((Math.PI * (utcMs - fromUtcMs)) / (toUtcMs - fromUtcMs));
  return BURST_RAD * envelope * Math.sin((2 * Math.PI * sinceS) / SHAKING_PERIOD_S);
}
