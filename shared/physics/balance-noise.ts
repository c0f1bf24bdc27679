import type { RigDocument } from '@/shared/rig/document';
import { BOLTZMANN_J_K } from './constants';
import type { Oscillator } from './oscillator';
import { seededStreams, type GaussianSource } from './seeded-gaussian';

type NoiseTerms = NonNullable<RigDocument['noise']>;

const S_PER_MIN = 60;
const S_PER_H = 3600;
const GRAVITY_M_S2 = 9.80665;
/** Swing mode of a pendulum of 0.12 m, where the fibre's length is not known. */
const USUAL_SWING_HZ = 1.44;
const USUAL_BURST_RAD = 1e-4;
const USUAL_BURST_S = 30;
/** Torsion left behind by a burst, as a share of its amplitude (an estimate, no source). */
const KICK_SHARE = 0.1;

interface Burst {
  startS: number;
  phaseRad: number;
}

/**
 * The noise of a rig's deflection record (`rig.noise`; a term that is absent is zero): white readout noise, random walk
 * and linear drift of the zero, thermal torque, bursts of people and doors. Each term draws from a stream of its own, so
 * that leaving one out does not change the others.
 */
export class BalanceNoise {
  private readonly readout: GaussianSource;
  private readonly walk: GaussianSource;
  private readonly thermal: GaussianSource;
  private readonly bursts: GaussianSource;
  private readonly swingRadS: number;
  private walkedRad = 0;
  private burst: Burst | null = null;
  private nextBurstS: number;

  constructor(
    private readonly terms: NoiseTerms,
    private readonly oscillator: Oscillator,
    { seed, fibreM }: { seed: number; fibreM: number | undefined },
  ) {
    [this.readout, this.walk, this.thermal, this.bursts] = seededStreams(seed, 4) as [
      GaussianSource,
      GaussianSource,
      GaussianSource,
      GaussianSource,
    ];
    this.swingRadS = fibreM === undefined ? 2 * Math.PI * USUAL_SWING_HZ : Math.sqrt(GRAVITY_M_S2 / fibreM);
    this.nextBurstS = this.waitS();
  }

  /** What is added to the true angle in a sample at `atS`, rad; `stepS` since the sample before it. */
  addedRad(atS: number, stepS: number): number {
    const { readout_rad: white = 0, walk_rad_per_sqrt_min: walk = 0, drift_rad_per_h: drift = 0 } = this.terms;
    if (walk > 0) this.walkedRad += walk * Math.sqrt(stepS / S_PER_MIN) * this.walk.next();
    const noise = white > 0 ? white * this.readout.next() : 0;
    return noise + this.walkedRad + (drift * atS) / S_PER_H + this.burstRad(atS);
  }

  /** Kick of the angular speed within `stepS`, rad/s: thermal torque of one-sided density 4 kB T c, c = 2 I γ, and what bursts leave. */
  kickRadS(atS: number, stepS: number): number {
    const { temperature_K: temperature = 0, burst_rad: burst = USUAL_BURST_RAD } = this.terms;
    const { inertiaKgM2, gamma, omega0 } = this.oscillator;
    const thermal = temperature > 0 ? Math.sqrt((4 * BOLTZMANN_J_K * temperature * gamma * stepS) / inertiaKgM2) * this.thermal.next() : 0;
    if (atS < this.nextBurstS) return thermal;
    this.burst = { startS: atS, phaseRad: Math.PI * this.bursts.uniform() };
    this.nextBurstS = atS + this.waitS();
    return thermal + KICK_SHARE * burst * omega0 * this.bursts.next();
  }

  private burstRad(atS: number): number {
    if (this.burst === null) return 0;
    const { burst_rad: amplitude = USUAL_BURST_RAD, burst_s: length = USUAL_BURST_S } = this.terms;
    const sinceS = atS - this.burst.startS;
    if (sinceS > length) this.burst = null;
    return this.burst === null
      ? 0
      : amplitude * Math.sin((Math.PI * sinceS) / length) * Math.sin(this.swingRadS * sinceS + this.burst.phaseRad);
  }

  private waitS(): number {
    const perHour = this.terms.bursts_per_h ?? 0;
    return perHour > 0 ? (this.bursts.wait() * S_PER_H) / perHour : Infinity;
  }
}
