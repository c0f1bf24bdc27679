import type { Oscillator } from './oscillator';
import { torquePerG, type TorqueGeometry } from './torque';

/** Steps per period: a phase error of (2π/200)⁵/120 a step, 5e-8 a period, from the fourth-order rule. */
const STEPS_PER_PERIOD = 200;
/** While the sources turn the torque has corners: short steps keep them harmless, s. */
const STEP_IN_MOTION_S = 0.1;
/** Guards counts of steps against rounding. */
const TINY = 1e-9;

export interface PendulumSetting {
  geometry: TorqueGeometry;
  oscillator: Pick<Oscillator, 'periodS' | 'kappa' | 'inertiaKgM2' | 'gamma'>;
  bigG: number;
  /** Greatest step while the sources turn, s: a longer one than usual is for a motion without corners. */
  stepInMotionS?: number;
}

/** I θ̈ + 2 I γ θ̇ + κ θ = G g(φ − θ), with the exact torque g of the sources, by the classical Runge-Kutta rule. */
export class Pendulum {
  angleRad: number;
  speedRadS: number;
  /** Seconds since the start up to which it is worked out. */
  atS: number;

  /** From `atS` on, s. */
  constructor(
    private readonly setting: PendulumSetting,
    initial: { angleRad: number; speedRadS: number },
    atS = 0,
  ) {
    this.atS = atS;
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
    const parts = turning ? Math.ceil(h / (this.setting.stepInMotionS ?? STEP_IN_MOTION_S) - TINY) : 1;
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
