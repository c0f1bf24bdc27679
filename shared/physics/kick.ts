import type { PendulumSetting } from './pendulum';
import { angleOfRest, areApart, motionAfter, movesByCentroid, type Slew, standingAt, type TimedMove } from './timed-moves';

export interface KickInput {
  setting: PendulumSetting;
  slew: Slew;
  fromDeg: number;
  /** Where the sources turn to and come back from, deg. */
  toDeg: number;
  amplitudeRad: number;
}

export interface Kick {
  /** There and back, `moves.length / 2` times. */
  moves: TimedMove[];
  /** From the start of the first move to the end of the last, s. */
  durationS: number;
  /** By the exact equation, rad. */
  amplitudeRad: number;
}

export interface NoKick {
  why: string;
  /** No number of moves gives this amplitude or more, rad; null where the reason is another. */
  limitRad: number | null;
}

/** More moves there and back than this are not made: what they add is less than the last per cent. */
const mostRounds = 40;

/**
 * The fewest moves there and back that give the amplitude, with torque centroids half a damped period apart and the last round shortened.
 * With D the difference of the rests and K what half a period leaves, n rounds give at most D (1 − K^2n)/(1 − K).
 */
export function kickMoves(input: KickInput): Kick | NoKick {
  const { setting, fromDeg, toDeg, amplitudeRad } = input;
  let rests: { from: ReturnType<typeof standingAt>; to: ReturnType<typeof standingAt> };
  try {
    rests = { from: standingAt(setting, fromDeg), to: standingAt(setting, toDeg) };
  } catch (error) {
    return { why: (error as Error).message, limitRad: null };
  }
  const distanceRad = Math.abs(rests.to.restRad - rests.from.restRad);
  const ratio = Math.exp((-setting.oscillator.gamma * setting.oscillator.periodS) / 2);
  const limitRad = distanceRad / (1 - ratio);
  const most = (rounds: number) => distanceRad * ((1 - ratio ** (2 * rounds)) / (1 - ratio));
  let rounds = 1;
  while (rounds < mostRounds && most(rounds) < amplitudeRad) rounds += 1;
  for (; rounds <= mostRounds && amplitudeRad < limitRad; rounds += 1) {
    const before = most(rounds - 1);
    const guess = (amplitudeRad - ratio * ratio * before) / (distanceRad * (1 + ratio));
    const found = fitted(input, rounds, Math.min(1, guess));
    if (found === 'too slow') return { why: 'the turntable is too slow to go there and back in a period', limitRad: null };
    if (found !== null) return found;
  }
  return { why: 'the amplitude is beyond what any number of moves gives', limitRad };
}

/** The last round as a fraction of the way, by the secant rule on the exact equation; null where the whole way is too little. */
function fitted(input: KickInput, rounds: number, guess: number): Kick | 'too slow' | null {
  const { setting, slew, amplitudeRad } = input;
  const made = (fraction: number) => {
    const moves = roundsOf(input, rounds, fraction);
    return { moves, left: areApart(moves) ? motionAfter(setting, slew, moves).amplitudeRad : Number.NaN };
  };
  let fraction = Math.max(1e-3, guess);
  let found = made(fraction);
  let other = { fraction: 0, left: rounds === 1 ? 0 : made(1e-3).left };
  for (let round = 0; round < 8 && Math.abs(found.left / amplitudeRad - 1) > 1e-4; round += 1) {
    if (Number.isNaN(found.left)) return 'too slow';
    const slope = (found.left - other.left) / (fraction - other.fraction);
    const next = fraction + (amplitudeRad - found.left) / slope;
    if (next > 1 && fraction === 1) return null;
    other = { fraction, left: found.left };
    fraction = Math.min(1, Math.max(1e-3, next));
    found = made(fraction);
  }
  if (Number.isNaN(found.left)) return 'too slow';
  const last = found.moves[found.moves.length - 1] as TimedMove;
  return { moves: found.moves, durationS: last.startS + last.durationS, amplitudeRad: found.left };
}

function roundsOf({ setting, slew, fromDeg, toDeg }: KickInput, rounds: number, fraction: number): TimedMove[] {
  const from = standingAt(setting, fromDeg);
  const to = standingAt(setting, toDeg);
  const turnDeg = fraction >= 1 ? toDeg : angleOfRest(setting, { fromDeg, toDeg }, from.restRad + fraction * (to.restRad - from.restRad));
  const anglesDeg = [fromDeg];
  const pausesS: number[] = [];
  for (let round = 1; round <= rounds; round += 1) {
    const thereDeg = round === rounds ? turnDeg : toDeg;
    anglesDeg.push(thereDeg, fromDeg);
    pausesS.push(standingAt(setting, thereDeg).halfPeriodS, from.halfPeriodS);
  }
  return movesByCentroid(setting, slew, { anglesDeg, pausesS: pausesS.slice(0, -1) });
}
