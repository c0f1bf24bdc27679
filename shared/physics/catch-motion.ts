/** A motion relative to the rest at the target: rad (or any unit) and the same per s. */
export interface MotionToCatch {
  off: number;
  speed: number;
}

export interface Catch {
  /** Where the rest is to lie meanwhile, relative to the target. */
  level: number;
  /** For how long, s. */
  holdS: number;
}

const looks = 720;

/**
 * Hold the rest at `level` for `holdS`, then at the target: a linear pendulum of damped angular frequency ω (rad/s) and decay rate γ (1/s)
 * then rests there. The shortest such hold within a period; null where there is none.
 *
 * With the propagator (a b; c d) of off and speed over t the pendulum arrives at rest where v₀(d − e^(−2γt)) + c x₀ = 0, and the level is
 * x₀ − (b v₀ + x₀)/(1 − a). From rest this is the two-move shaper: level x₀K/(1+K) for half a period (Smith 1957).
 */
export function catchMotion({ off, speed }: MotionToCatch, { omega, gamma }: { omega: number; gamma: number }): Catch | null {
  const periodS = (2 * Math.PI) / omega;
  const miss = (tS: number) => {
    const decay = Math.exp(-gamma * tS);
    const [cos, sin] = [Math.cos(omega * tS), Math.sin(omega * tS)];
    const c = (-decay * (omega * omega + gamma * gamma) * sin) / omega;
    return speed * (decay * (cos - (gamma / omega) * sin) - decay * decay) + c * off;
  };
  // The root at 0 is no hold at all.
  let lowS = periodS / looks;
  let highS = lowS;
  do {
    lowS = highS;
    highS += periodS / looks;
    if (highS > periodS) return null;
  } while (miss(lowS) * miss(highS) > 0);
  for (let halving = 0; halving < 60; halving += 1) {
    const middleS = (lowS + highS) / 2;
    if (miss(lowS) * miss(middleS) <= 0) highS = middleS;
    else lowS = middleS;
  }
  const decay = Math.exp(-gamma * highS);
  const sin = Math.sin(omega * highS);
  const a = decay * (Math.cos(omega * highS) + (gamma / omega) * sin);
  const b = (decay * sin) / omega;
  return { level: off - (b * speed + off) / (1 - a), holdS: highS };
}
