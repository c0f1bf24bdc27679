import { equilibriumRad } from '../physics/equilibrium';
import { Pendulum, type PendulumSetting } from '../physics/pendulum';
import { at } from '../statistics/symmetric';
import { settingOf, type ClockOffset, type Fitted } from './clock-offset';
import type { Segment } from './segment';
import { turntableOf } from './turntable';

const greatestGapS = 60;
const rounds = 4;
/** What the profile of a swing leaves open, s: with the rig's acceleration known, and with a guess. */
const profileU = { known: 5e-4, guessed: 0.01 };

/**
 * The fine search: the state at the end of each dwell, carried by the exact equation through the swing as the log times it, against the
 * state at the start of the next. Least squares over all swings; the uncertainty is their scatter, and never less than what they miss each
 * other by: shaped swings leave the pendulum nearly at rest, whenever they began, and tell little. Null with fewer than three swings.
 */
export function fineOffset(fitted: Fitted): ClockOffset | null {
  const setting = settingOf(fitted);
  const turntable = turntableOf(fitted.archive.steps, fitted.archive.rig);
  const passages = setting === null ? null : passagesOf(fitted, setting);
  if (setting === null || turntable === null || passages === null || passages.length < 3) return null;
  const omega = (2 * Math.PI) / setting.oscillator.periodS;
  const missed = (passage: Passage, offsetS: number, by = setting): [number, number] => {
    const end = carried(by, passage, (atS) => turntable.angleRad((passage.epochS + atS - offsetS) * 1000));
    return [end.angleRad - passage.to.angleRad, (end.speedRadS - passage.to.speedRadS) / omega];
  };
  const missedAll = (offsetS: number) => passages.map((passage) => missed(passage, offsetS));
  let offset = 0;
  let misses = missedAll(0);
  const unmoved = sumOfSquares(misses);
  let [step, weight, scatter] = [0, 0, 0];
  let slopes: Misses = [];
  for (let round = 0; round < rounds; round += 1) {
    const probeS = 0.05;
    const later = missedAll(offset + probeS);
    const each = misses.map((here, i) => {
      const slope = here.map((value, k) => (((later[i] as number[])[k] as number) - value) / probeS) as [number, number];
      return { slope, pull: slope[0] * here[0] + slope[1] * here[1], weight: slope[0] ** 2 + slope[1] ** 2 };
    });
    slopes = each.map(({ slope }) => slope);
    weight = each.reduce((sum, one) => sum + one.weight, 0);
    if (!(weight > 0)) return null;
    const wanted = -each.reduce((sum, one) => sum + one.pull, 0) / weight;
    scatter = scatterOf(each.map((one) => one.pull + one.weight * wanted));
    [step, misses] = downhill(wanted, misses, (s) => missedAll(offset + s));
    offset += step;
    if (Math.abs(step) < 1e-6) break;
  }
  if (!Number.isFinite(offset)) return null;
  const count = passages.length;
  const variance = sumOfSquares(misses) / (2 * count - 1);
  const gain = unmoved - sumOfSquares(misses);
  const u = Math.max(
    Math.sqrt((scatter * count) / (count - 1)) / weight,
    Math.sqrt(variance / weight),
    // Where the misfit is no parabola: how much worse no offset fits.
    offset === 0 ? 0 : Math.abs(offset) * Math.sqrt(variance / gain),
  );
  /** How much the offset changes with what is known of the pendulum: that errs in all swings alike, so their scatter does not show it. */
  const changeBy = ({ fit = none, free = none }: { fit?: Change; free?: Change }): number => {
    const other = changed(setting, free);
    const pull = (passagesOf(fitted, setting, { fit, other }) ?? []).reduce((sum, passage, i) => {
      const moved = missed(passage, offset, other);
      const [slopeX, slopeV] = slopes[i] ?? [0, 0];
      const [x, v] = misses[i] ?? [0, 0];
      return sum + slopeX * (moved[0] - x) + slopeV * (moved[1] - v);
    }, 0);
    return -pull / weight;
  };
  const common = commonErrors(fitted).map(changeBy);
  return {
    value: offset,
    u: Math.hypot(u, ...common, profileU[fitted.archive.rig.motion === undefined ? 'guessed' : 'known'], logU(fitted)),
  };
}

type Misses = [number, number][];

const sumOfSquares = (misses: Misses) => misses.reduce((sum, [a, b]) => sum + a * a + b * b, 0);

/** As much of the wanted step as lessens the misfit, and the misfit there; none where nothing does. */
function downhill(wanted: number, misses: Misses, missedAfter: (stepS: number) => Misses): [number, Misses] {
  for (let share = 1; share > 0.01; share /= 2) {
    const next = missedAfter(share * wanted);
    if (sumOfSquares(next) < sumOfSquares(misses)) return [share * wanted, next];
  }
  return [0, misses];
}

/** Sum of squares, neighbours included where they add: a dwell's error shows in the swing before it and in the one after. */
function scatterOf(deviations: readonly number[]): number {
  const squares = deviations.reduce((sum, one) => sum + one * one, 0);
  const neighbours = deviations.slice(1).reduce((sum, one, k) => sum + one * (deviations[k] as number), 0);
  return squares + 2 * Math.max(0, neighbours);
}

/** The log's own uncertainty of its swings' times, of their mean. */
function logU({ archive: { steps } }: Fitted): number {
  const swings = steps.filter(({ kind }) => kind === 'swing');
  return Math.sqrt(swings.reduce((sum, { uStartS }) => sum + uStartS * uStartS, 0)) / Math.max(1, swings.length);
}

interface State {
  angleRad: number;
  speedRadS: number;
}

/** From the last datum of one window to the start of the next, s after `epochS`. */
interface Passage {
  epochS: number;
  from: State;
  to: State;
  lengthS: number;
}

function carried(setting: PendulumSetting, { from, lengthS }: Passage, phiAt: (atS: number) => number): State {
  const pendulum = new Pendulum(setting, from);
  pendulum.advanceTo(lengthS, phiAt);
  return pendulum;
}

/** Of a pendulum's angular frequency, rad/s, and decay, 1/s. */
interface Change {
  omega: number;
  gamma: number;
}
const none: Change = { omega: 0, gamma: 0 };

/**
 * Standard uncertainties of what all swings share, one after the other: what the dwells' own fit errs by, and the free pendulum with it as far as it
 * comes from there; and what the free pendulum errs by besides.
 */
function commonErrors({ found, free }: Fitted): { fit?: Change; free?: Change }[] {
  const { omega: ofOmega, gamma: ofGamma } = free.ringDownShare;
  const covariance = found?.ringDown?.covariance;
  const fit = {
    omega: Math.sqrt(covariance === undefined ? 0 : at(covariance, 0, 0)),
    gamma: Math.sqrt(covariance === undefined ? 0 : at(covariance, 1, 1)),
  };
  const besides = (u: number, ofFit: number) => (u > ofFit * (1 + 1e-6) ? Math.sqrt(u * u - ofFit * ofFit) : 0);
  const errors = [
    { fit: { omega: fit.omega, gamma: 0 }, free: { omega: ofOmega * fit.omega, gamma: 0 } },
    { fit: { omega: 0, gamma: fit.gamma }, free: { omega: 0, gamma: ofGamma * fit.gamma } },
    { free: { omega: besides((2 * Math.PI * free.period.u) / free.period.value ** 2, ofOmega * fit.omega), gamma: 0 } },
    { free: { omega: 0, gamma: besides(free.gamma.u, ofGamma * fit.gamma) } },
  ];
  return errors.filter((error) => [error.fit ?? none, error.free].some(({ omega, gamma }) => omega + gamma > 0));
}

function changed({ oscillator, ...rest }: PendulumSetting, change: Change): PendulumSetting {
  const omega = (2 * Math.PI) / oscillator.periodS + change.omega;
  const gamma = oscillator.gamma + change.gamma;
  const kappa = oscillator.inertiaKgM2 * (omega * omega + gamma * gamma);
  return { ...rest, oscillator: { ...oscillator, gamma, periodS: (2 * Math.PI) / omega, kappa } };
}

/**
 * The fit of a dwell knows its ringing best at one instant, whatever frequency and decay are: where those are other ones, the start lies elsewhere on the
 * same ringing. That instant is the centre of e^(−2γt) over the dwell, s after its start.
 */
function centreS(spanS: number, gamma: number): number {
  const fall = 2 * gamma * spanS;
  return fall < 1e-3 ? spanS / 2 : spanS * (1 / fall - 1 / Math.expm1(fall));
}

function startOf({ x, v }: { x: number; v: number }, fit: Change, { omega, centre }: { omega: number; centre: number }) {
  const phase = -fit.omega * centre;
  const growth = Math.exp(fit.gamma * centre);
  return {
    x: growth * (x * Math.cos(phase) + (v / omega) * Math.sin(phase)),
    v: growth * (v * Math.cos(phase) - x * omega * Math.sin(phase)),
  };
}

function passagesOf(
  { segments, found }: Fitted,
  setting: PendulumSetting,
  { fit, other }: { fit: Change; other: PendulumSetting } = { fit: none, other: setting },
): Passage[] {
  const { periodS, gamma } = setting.oscillator;
  const omega = (2 * Math.PI) / periodS;
  const order = segments
    .map((_, i) => i)
    .sort((a, b) => (segments[a] as Segment).window.fromUtcMs - (segments[b] as Segment).window.fromUtcMs);
  return order.slice(1).flatMap((next, k) => {
    const [before, after] = [segments[order[k] as number] as Segment, segments[next] as Segment];
    const lengthS = (after.window.fromUtcMs - before.window.toUtcMs) / 1000;
    const starts = [found?.bias?.starts[order[k] as number], found?.bias?.starts[next]];
    if (before.window.angleDeg === after.window.angleDeg || lengthS > greatestGapS + setting.oscillator.periodS) return [];
    const [own, to] = [starts[0], starts[1]?.[0]];
    if (own === undefined || to === undefined || own.length !== 1 || after.knocksS.length > 0) return [];
    const spanS = (before.window.toUtcMs - before.window.fromUtcMs) / 1000;
    const [restBefore, restAfter] = [restOf(before, setting), restOf(after, setting)];
    const from0 = startOf(own[0] ?? { x: 0, v: 0 }, fit, { omega, centre: centreS(spanS, gamma) });
    const to0 = startOf(to, fit, { omega, centre: centreS((after.window.toUtcMs - after.window.fromUtcMs) / 1000, gamma) });
    const began = { angleRad: restBefore + from0.x, speedRadS: from0.v };
    const phi = ((before.window.angleDeg ?? 0) * Math.PI) / 180;
    const from = carried(other, { epochS: 0, from: began, to: began, lengthS: spanS }, () => phi);
    const end = { angleRad: restAfter + to0.x, speedRadS: to0.v };
    return [{ epochS: before.window.toUtcMs / 1000, from: { ...from }, to: end, lengthS }];
  });
}

function restOf({ window }: Segment, { geometry, oscillator, bigG }: PendulumSetting): number {
  return equilibriumRad({ geometry, kappa: oscillator.kappa, bigG, phiRad: ((window.angleDeg ?? 0) * Math.PI) / 180 });
}
