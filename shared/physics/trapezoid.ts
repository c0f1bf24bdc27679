export interface TrapezoidInput {
  fromDeg: number;
  toDeg: number;
  /** Greatest speed, deg/s, positive. */
  speedDegS: number;
  /** Acceleration and deceleration, deg/s2, positive. */
  accelerationDegS2: number;
}

export interface Trapezoid {
  durationS: number;
  /** Angle (deg) at `tS` seconds after the start; the end angles before and after the motion. */
  angleDegAt(tS: number): number;
  /** Greatest speed that is reached, deg/s (below the limit in a short move). */
  peakSpeedDegS: number;
}

/** A straight move from rest to rest with constant acceleration, cruise and deceleration. */
export function trapezoid({ fromDeg, toDeg, speedDegS, accelerationDegS2 }: TrapezoidInput): Trapezoid {
  if (!(speedDegS > 0) || !(accelerationDegS2 > 0)) throw new Error('a move needs a positive speed and a positive acceleration');
  const distanceDeg = Math.abs(toDeg - fromDeg);
  const sign = Math.sign(toDeg - fromDeg);
  const cruises = distanceDeg >= (speedDegS * speedDegS) / accelerationDegS2;
  const peakSpeedDegS = cruises ? speedDegS : Math.sqrt(distanceDeg * accelerationDegS2);
  const rampS = peakSpeedDegS / accelerationDegS2;
  const durationS = cruises ? distanceDeg / speedDegS + speedDegS / accelerationDegS2 : 2 * rampS;

  const travelledDeg = (tS: number): number => {
    if (tS <= 0) return 0;
    if (tS >= durationS) return distanceDeg;
    if (tS < rampS) return 0.5 * accelerationDegS2 * tS * tS;
    const leftS = durationS - tS;
    if (leftS < rampS) return distanceDeg - 0.5 * accelerationDegS2 * leftS * leftS;
    return 0.5 * accelerationDegS2 * rampS * rampS + peakSpeedDegS * (tS - rampS);
  };
  return { durationS, peakSpeedDegS, angleDegAt: (tS) => (tS >= durationS ? toDeg : fromDeg + sign * travelledDeg(tS)) };
}
