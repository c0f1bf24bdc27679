import type { RigDocument } from '@/shared/rig/document';
import { BalanceNoise } from './balance-noise';
import { RAD_PER_DEG } from './constants';
import { equilibriumRad } from './equilibrium';
import { oscillatorOf, type Oscillator } from './oscillator';
import { geometryOf, torquePerG, type TorqueGeometry } from './torque';

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

/** Steps per period: a phase error of (2π/200)⁵/120 a step, 5e-8 a period, from the fourth-order rule. */
const STEPS_PER_PERIOD = 200;
/** While the sources turn the torque has corners: short steps keep them harmless, s. */
const STEP_IN_MOTION_S = 0.1;
const MS_PER_S = 1000;
/** Guards counts of steps and samples against rounding. */
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

interface PendulumSetting {
  geometry: TorqueGeometry;
  oscillator: Oscillator;
  bigG: number;
}

/** I θ̈ + 2 I γ θ̇ + κ θ = G g(φ − θ), with the exact torque g of the sources, by the classical Runge-Kutta rule. */
class Pendulum {
  angleRad: number;
  speedRadS: number;
  /** Seconds since the start up to which it is worked out. */
  atS = 0;

  constructor(
    private readonly setting: PendulumSetting,
    initial: { angleRad: number; speedRadS: number },
  ) {
    this.angleRad = initial.angleRad;
    this.speedRadS = initial.speedRadS;
  }

  advanceTo(atS: number, phiAt: (atS: number) => number): void {
    const beganS = this.atS;
    const steps = Math.ceil((atS - beganS) / (this.setting.oscillator.periodS / STEPS_PER_PERIOD) - TINY);
    const h = (atS - beganS) / steps;
    for (let index = 0; index < steps; index += 1) this.integrate(beganS + h * index, h, phiAt);
    this.atS = atS;
  }

  /** In shorter steps while the sources turn. */
  private integrate(fromS: number, h: number, phiAt: (atS: number) => number): void {
    const from = phiAt(fromS);
    const middle = phiAt(fromS + h / 2);
    const to = phiAt(fromS + h);
    const turning = from !== middle || middle !== to;
    const parts = turning ? Math.ceil(h / STEP_IN_MOTION_S - TINY) : 1;
    if (parts <= 1) return this.step(h, { from, middle, to });
    for (let part = 0; part < parts; part += 1) {
      const at = (place: number) => phiAt(fromS + (h * place) / parts);
      this.step(h / parts, { from: at(part), middle: at(part + 0.5), to: at(part + 1) });
    }
  }

  private step(h: number, phi: { from: number; middle: number; to: number }): void {
    const { angleRad: theta, speedRadS: omega } = this;
    const a1 = this.acceleration(theta, omega, phi.from);
    const w2 = omega + 0.5 * h * a1;
    const a2 = this.acceleration(theta + 0.5 * h * omega, w2, phi.middle);
    const w3 = omega + 0.5 * h * a2;
    const a3 = this.acceleration(theta + 0.5 * h * w2, w3, phi.middle);
    const w4 = omega + h * a3;
    const a4 = this.acceleration(theta + h * w3, w4, phi.to);
    this.angleRad = theta + (h / 6) * (omega + 2 * w2 + 2 * w3 + w4);
    this.speedRadS = omega + (h / 6) * (a1 + 2 * a2 + 2 * a3 + a4);
  }

  private acceleration(theta: number, omega: number, phi: number): number {
    const { geometry, oscillator, bigG } = this.setting;
    return (bigG * torquePerG(geometry, phi - theta) - oscillator.kappa * theta) / oscillator.inertiaKgM2 - 2 * oscillator.gamma * omega;
  }
}
