import { CODATA_2022_G } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { Pendulum, type PendulumSetting } from '../physics/pendulum';
import { leastSquares } from '../statistics/least-squares';
import { SingularMatrixError } from '../statistics/symmetric';
import type { Archive } from '../archive/read-archive';
import type { FreeOscillator } from './free-oscillator';
import type { DwellFit } from './ring-down-fit';
import type { Segment } from './segment';
import type { GSolution, GSystem } from './solve-g';
import { turntableOf, type Turntable } from './turntable';

/** How much later the channel's clock shows than that of the step log, s. */
export interface ClockOffset {
  value: number;
  u: number;
}

interface Fitted {
  archive: Archive;
  segments: readonly Segment[];
  found: DwellFit | null;
  free: FreeOscillator;
  system: GSystem | null;
  solution: GSolution | null;
}

/** The setting of the sources and the pendulum, with G of CODATA where the night gave none. */
function settingOf({ free, system, solution }: Fitted): PendulumSetting | null {
  if (system === null || system.geometry.pairs.length === 0) return null;
  const { inertiaKgM2, geometry } = system;
  const omega0Squared = solution?.omega0Squared ?? free.omega0Squared.value;
  const gamma = solution?.gamma ?? free.gamma.value;
  const periodS = (2 * Math.PI) / Math.sqrt(omega0Squared - gamma * gamma);
  const bigG = solution !== null && solution.bigG > 0 ? solution.bigG : CODATA_2022_G.value;
  return { geometry, bigG, oscillator: { inertiaKgM2, gamma, periodS, kappa: inertiaKgM2 * omega0Squared } };
}

const columnsBeside = 4;
/** Steps of a fortieth of a period. */
const lagsEachWay = 10;
/** A lag must fit better than none by this many variances of a datum: five standard deviations. */
const leastGain = 25;

/**
 * The coarse search: the record against the motion that the step log gives, lag by lag within a quarter of a period (beyond, the sign
 * is ambiguous), with offset, drift and the ringing from before the record left free. Null where there is nothing to compare, or where
 * no offset fits hardly worse: after shaped swings the record looks alike with any lag of some seconds.
 */
export function coarseOffset(fitted: Fitted): ClockOffset | null {
  const setting = settingOf(fitted);
  const turntable = turntableOf(fitted.archive.steps, fitted.archive.rig);
  if (setting === null || turntable === null || fitted.segments.length < 2) return null;
  const { periodS } = setting.oscillator;
  const stepS = periodS / 40;
  const data = fitted.segments.flatMap(({ window, averages: { t, y } }) =>
    [...t].map((tS, i) => ({ atS: window.fromUtcMs / 1000 + tS, y: y[i] as number })),
  );
  const fromS = (turntable.moves[0]?.startUtcMs ?? 0) / 1000 - periodS / 2;
  const predicted = motionFrom(setting, turntable, { fromS, toS: (data.at(-1)?.atS ?? fromS) + periodS / 2, stepS });
  const used = data.filter(({ atS }) => atS > fromS + periodS / 4);
  if (used.length <= 2 * columnsBeside + 4) return null;
  const lags = Array.from({ length: 2 * lagsEachWay + 1 }, (_, k) => (k - lagsEachWay) * stepS);
  const rest = lags.map((lagS) =>
    restAt(used, { lagS, fromS, periodS, gamma: setting.oscillator.gamma, motion: (atS) => predicted((atS - fromS) / stepS) }),
  );
  const best = rest.indexOf(Math.min(...rest));
  const variance = (rest[best] as number) / (used.length - 2 * columnsBeside);
  if (!((rest[lagsEachWay] as number) - (rest[best] as number) > leastGain * variance)) return null;
  const [before, here, after] = [rest[best - 1], rest[best], rest[best + 1]] as [number | undefined, number, number | undefined];
  const bend = before === undefined || after === undefined ? 0 : before - 2 * here + after;
  const shift = bend > 0 ? ((before as number) - (after as number)) / (2 * bend) : 0;
  return {
    value: (best - lagsEachWay + shift) * stepS,
    u: Math.hypot(stepS / Math.sqrt(12), bend > 0 ? stepS * Math.sqrt((2 * variance) / bend) : 0),
  };
}

/** The pendulum from rest on, as a function of the number of steps since the start (linear in between). */
function motionFrom(
  setting: PendulumSetting,
  turntable: Turntable,
  { fromS, toS, stepS }: { fromS: number; toS: number; stepS: number },
): (steps: number) => number {
  const phiRad = turntable.angleRad(fromS * 1000);
  const angleRad = equilibriumRad({ ...setting, kappa: setting.oscillator.kappa, phiRad });
  const pendulum = new Pendulum(setting, { angleRad, speedRadS: 0 });
  const angles = Float64Array.from({ length: Math.ceil((toS - fromS) / stepS) + 1 }, (_, k) => {
    if (k > 0) pendulum.advanceTo(k * stepS, (atS) => turntable.angleRad((fromS + atS) * 1000));
    return pendulum.angleRad;
  });
  return (steps) => {
    const k = Math.min(angles.length - 2, Math.max(0, Math.floor(steps)));
    const [a, b] = [angles[k] as number, angles[k + 1] as number];
    return a + (b - a) * (steps - k);
  };
}

interface Lagged {
  lagS: number;
  fromS: number;
  periodS: number;
  gamma: number;
  motion: (atS: number) => number;
}

function restAt(data: readonly { atS: number; y: number }[], { lagS, fromS, periodS, gamma, motion }: Lagged): number {
  const spanS = (data.at(-1)?.atS ?? fromS) - fromS;
  const x = data.map(({ atS }) => (2 * (atS - fromS)) / spanS - 1);
  const ringing = (f: (angle: number) => number) =>
    data.map(({ atS }) => Math.exp(-gamma * (atS - fromS)) * f((2 * Math.PI * (atS - fromS)) / periodS));
  const columns = [
    data.map(({ atS }) => motion(atS - lagS)),
    ...Array.from({ length: columnsBeside }, (_, power) => x.map((value) => value ** power)),
    ringing(Math.cos),
    ringing(Math.sin),
  ];
  try {
    return leastSquares(
      columns,
      data.map(({ y }) => y),
    ).ssr;
  } catch (error) {
    if (error instanceof SingularMatrixError) return Infinity;
    throw error;
  }
}

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
  const missed = (passage: Passage, offsetS: number): [number, number] => {
    const end = carried(setting, passage, (atS) => turntable.angleRad((passage.epochS + atS - offsetS) * 1000));
    return [end.angleRad - passage.to.angleRad, (end.speedRadS - passage.to.speedRadS) / omega];
  };
  const missedAll = (offsetS: number) => passages.map((passage) => missed(passage, offsetS));
  let offset = 0;
  let misses = missedAll(0);
  const unmoved = sumOfSquares(misses);
  let [step, weight, scatter] = [0, 0, 0];
  for (let round = 0; round < rounds; round += 1) {
    const probeS = 0.05;
    const later = missedAll(offset + probeS);
    const each = misses.map((here, i) => {
      const slope = here.map((value, k) => (((later[i] as number[])[k] as number) - value) / probeS) as [number, number];
      return { pull: slope[0] * here[0] + slope[1] * here[1], weight: slope[0] ** 2 + slope[1] ** 2 };
    });
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
  return { value: offset, u: Math.hypot(u, profileU[fitted.archive.rig.motion === undefined ? 'guessed' : 'known'], logU(fitted)) };
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

function passagesOf({ segments, found }: Fitted, setting: PendulumSetting): Passage[] {
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
    const began = { angleRad: restBefore + (own[0]?.x ?? 0), speedRadS: own[0]?.v ?? 0 };
    const phi = ((before.window.angleDeg ?? 0) * Math.PI) / 180;
    const from = carried(setting, { epochS: 0, from: began, to: began, lengthS: spanS }, () => phi);
    const end = { angleRad: restAfter + to.x, speedRadS: to.v };
    return [{ epochS: before.window.toUtcMs / 1000, from: { ...from }, to: end, lengthS }];
  });
}

function restOf({ window }: Segment, { geometry, oscillator, bigG }: PendulumSetting): number {
  return equilibriumRad({ geometry, kappa: oscillator.kappa, bigG, phiRad: ((window.angleDeg ?? 0) * Math.PI) / 180 });
}
