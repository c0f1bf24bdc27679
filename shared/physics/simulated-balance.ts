import type { RigDocument } from '@/shared/rig/document';
import { BalanceNoise } from './balance-noise';
import { RAD_PER_DEG } from './constants';
import { equilibriumRad } from './equilibrium';
import { oscillatorOf } from './oscillator';
import { Pendulum } from './pendulum';
import { geometryOf } from './torque';

export interface SimulatedBalanceOptions {
  rig: RigDocument;
  /** G that the pendulum obeys, m3 kg-1 s-2. */
  bigG: number;
  seed: number;
  /** Samples per second. */
  rateHz: number;
  startUtcMs: number;
  /** Turntable angle at whose equilibrium the pendulum rests at first, deg; default `motion.homeDeg`, else 0. */
  startDeg?: number;
  /** Another beginning than rest at that equilibrium. */
  initial?: { angleRad: number; speedRadS: number };
}

/** Mid-exposure instants (UTC ms) and pendulum angle with noise (rad); equal lengths. */
export interface DeflectionBatch {
  utcMs: Float64Array;
  value: Float64Array;
}

export interface AdvanceTo {
  toUtcMs: number;
  /** True angle of the turntable, deg. */
  angleDegAt: (utcMs: number) => number;
}

export interface SimulatedBalance {
  /** The samples whose exposure has ended by `toUtcMs` and that were not given before. */
  advance(to: AdvanceTo): DeflectionBatch;
}

const MS_PER_S = 1000;
/** Guards counts of samples against rounding. */
const TINY = 1e-9;

/**
 * A torsion pendulum between the sources, as it would be read: the true angle of `Pendulum` and the noise of `rig.noise`.
 * @throws Error when the rig has no measured period and decay time
 */
export function createSimulatedBalance(options: SimulatedBalanceOptions): SimulatedBalance {
  const { rig, bigG, seed, rateHz, startUtcMs } = options;
  const oscillator = oscillatorOf(rig);
  if (oscillator === null) throw new Error('measured.period_s and measured.decayTime_s of the rig are needed to simulate its balance');
  if (!(rateHz > 0)) throw new Error(`a sampling rate above 0 Hz is needed, got ${rateHz}`);
  const geometry = geometryOf(rig);
  const phiRad = (options.startDeg ?? rig.motion?.homeDeg ?? 0) * RAD_PER_DEG;
  const rest = () => ({ angleRad: equilibriumRad({ geometry, kappa: oscillator.kappa, bigG, phiRad }), speedRadS: 0 });
  const pendulum = new Pendulum({ geometry, oscillator, bigG }, options.initial ?? rest());
  const noise = new BalanceNoise(rig.noise ?? {}, oscillator, { seed, fibreM: rig.fibre?.length?.value });
  let given = 0;

  function advance({ toUtcMs, angleDegAt }: AdvanceTo): DeflectionBatch {
    const phiAt = (atS: number) => angleDegAt(startUtcMs + atS * MS_PER_S) * RAD_PER_DEG;
    const due = Math.max(0, Math.floor(((toUtcMs - startUtcMs) / MS_PER_S) * rateHz + TINY) - given);
    const batch = { utcMs: new Float64Array(due), value: new Float64Array(due) };
    for (let index = 0; index < due; index += 1, given += 1) {
      const atS = (given + 0.5) / rateHz;
      const stepS = atS - pendulum.atS;
      pendulum.speedRadS += noise.kickRadS(pendulum.atS, stepS);
      pendulum.advanceTo(atS, phiAt);
      batch.utcMs[index] = startUtcMs + Math.round(atS * 1e6) / MS_PER_S;
      batch.value[index] = pendulum.angleRad + noise.addedRad(atS, stepS);
    }
    return batch;
  }

  return { advance };
}
