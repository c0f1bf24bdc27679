/**
 * Where the simulated turntable truly is, as a function of the controller's microseconds: stretches of constant
 * acceleration, each from and to an exact place, rest in between. Positions in microsteps, speeds in microsteps/s.
 */
export interface Stretch {
  fromUs: number;
  toUs: number;
  from: number;
  to: number;
  /** Signed, at the beginning. */
  speed: number;
  acceleration: number;
}

export interface Ramp {
  from: number;
  to: number;
  speed: number;
  acceleration: number;
  startUs: number;
}

const US = 1_000_000;
/** Guards against a stopping place that rounding moves a whole microstep on. */
const TINY_STEPS = 1e-6;
/** Stretches kept for those who ask about the past: well over an hour of ordinary swings. */
const KEPT = 256;

/** A trapezoid or triangle from rest to rest (physics of uniform acceleration; SPEC 8.1). */
export function rampStretches({ from, to, speed, acceleration, startUs }: Ramp): Stretch[] {
  const distance = Math.abs(to - from);
  if (distance === 0) return [];
  const sign = Math.sign(to - from);
  const cruises = distance > (speed * speed) / acceleration;
  const peak = cruises ? speed : Math.sqrt(distance * acceleration);
  const rampUs = (peak / acceleration) * US;
  const rampSteps = (peak * peak) / (2 * acceleration);
  const cruiseUs = cruises ? ((distance - 2 * rampSteps) / peak) * US : 0;
  const upUs = startUs + rampUs;
  const upTo = from + sign * rampSteps;
  const downUs = upUs + cruiseUs;
  const downFrom = cruises ? to - sign * rampSteps : upTo;
  const up: Stretch = { fromUs: startUs, toUs: upUs, from, to: upTo, speed: 0, acceleration: sign * acceleration };
  const down: Stretch = {
    fromUs: downUs,
    toUs: downUs + rampUs,
    from: downFrom,
    to,
    speed: sign * peak,
    acceleration: -sign * acceleration,
  };
  return cruises ? [up, { fromUs: upUs, toUs: downUs, from: upTo, to: downFrom, speed: sign * peak, acceleration: 0 }, down] : [up, down];
}

/** Deceleration to the next whole microstep at which `acceleration` or less suffices; empty when already there. */
export function brakeStretches({ position, speed }: Place, acceleration: number, startUs: number): Stretch[] {
  if (speed === 0) return [];
  const sign = Math.sign(speed);
  const needed = (speed * speed) / (2 * acceleration);
  const to = sign * Math.ceil(sign * position + needed - TINY_STEPS);
  const distance = Math.abs(to - position);
  if (distance < TINY_STEPS) return [];
  // Barely moving: the last microstep is made at the mean pace of a ramp's first, not by an ever gentler approach.
  const leastSpeed = Math.sqrt(2 * acceleration);
  if (Math.abs(speed) < leastSpeed) {
    const pace = leastSpeed / 2;
    return [{ fromUs: startUs, toUs: startUs + (distance / pace) * US, from: position, to, speed: sign * pace, acceleration: 0 }];
  }
  const durationUs = ((2 * distance) / Math.abs(speed)) * US;
  return [
    { fromUs: startUs, toUs: startUs + durationUs, from: position, to, speed, acceleration: (-sign * speed * speed) / (2 * distance) },
  ];
}

/** When the stretches first reach `place`; null when they do not. They run in one direction. */
export function reachedUs(stretches: readonly Stretch[], place: number): number | null {
  for (const { fromUs, toUs, from, to, speed, acceleration } of stretches) {
    if ((place - from) * (place - to) > 0) continue;
    const way = place - from;
    if (way === 0) return fromUs;
    const end = Math.sign(way) * Math.sqrt(Math.max(0, speed * speed + 2 * acceleration * way));
    return Math.min(toUs, fromUs + ((2 * way) / (speed + end)) * US);
  }
  return null;
}

export interface Place {
  position: number;
  speed: number;
}

export class Track {
  private readonly stretches: Stretch[] = [];

  constructor(private readonly origin: number) {}

  add(stretches: readonly Stretch[]): void {
    this.stretches.push(...stretches);
    if (this.stretches.length > 2 * KEPT) this.stretches.splice(0, this.stretches.length - KEPT);
  }

  /** Forgets what was to come after `us`, and stands at `position` from then on. */
  cut(us: number, position: number): void {
    while ((this.stretches.at(-1)?.fromUs ?? -Infinity) >= us) this.stretches.pop();
    const last = this.stretches.at(-1);
    if (last !== undefined && last.toUs > us) this.stretches[this.stretches.length - 1] = { ...last, toUs: us, to: this.at(us).position };
    this.stretches.push({ fromUs: us, toUs: us, from: position, to: position, speed: 0, acceleration: 0 });
  }

  at(us: number): Place {
    for (let index = this.stretches.length - 1; index >= 0; index -= 1) {
      const stretch = this.stretches[index] as Stretch;
      if (us >= stretch.toUs) return { position: stretch.to, speed: 0 };
      if (us >= stretch.fromUs) {
        const t = (us - stretch.fromUs) / US;
        return {
          position: stretch.from + (stretch.speed + 0.5 * stretch.acceleration * t) * t,
          speed: stretch.speed + stretch.acceleration * t,
        };
      }
    }
    return { position: this.stretches[0]?.from ?? this.origin, speed: 0 };
  }
}
