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

export interface Fitted {
  archive: Archive;
  segments: readonly Segment[];
  found: DwellFit | null;
  free: FreeOscillator;
  system: GSystem | null;
  solution: GSolution | null;
}

/** The setting of the sources and the pendulum, with G of CODATA where the night gave none. */
export function settingOf({ free, system, solution }: Fitted): PendulumSetting | null {
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
