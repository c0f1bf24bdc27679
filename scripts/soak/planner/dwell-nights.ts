import { oscillatorOf, type Oscillator } from '@/shared/physics/oscillator';
import { seededStreams, type GaussianSource } from '@/shared/physics/seeded-gaussian';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import { predictSignal } from '@/shared/protocol/predict';
import type { RigDocument } from '@/shared/rig/document';
import { differenceU, type Cadence } from '@/shared/planning/night-noise';
import type { Alternative } from '@/shared/planning/strategies';
import { predictU, togetherSource, type PredictedU } from '@/shared/planning/plan-uncertainty';
import { abaDifference } from '@/shared/statistics/drift';
import { offset, ringDownSegment } from '@/shared/statistics/ring-down';
import { fitSeparable, type SeparableSegment } from '@/shared/statistics/variable-projection';

/**
 * Nights at the level of dwells, to hold the planner against: readings with white noise and a wandering zero, the ringing that the strategy
 * leaves, one ring-down after a kick; fitted with a shared period and decay as the evaluation does, near minus far by ABA windows.
 */

const nightS = 12 * 3600;
const moveS = 10;
const rateHz = 10;
/** Readings are averaged over a twenty-fourth of the period. */
const binsPerPeriod = 24;
/** The calibration of practice: ten periods after a kick of 5 mrad. */
const ringDown = { periods: 10, amplitudeRad: 5e-3 };
/** Ringing at the start of a dwell as a share of the step. */
const ringing: Record<Alternative['strategy'], number> = { plain: 0.6, shaped: 0.01, wait: 0.01 };

const withNoise = (rig: RigDocument, readout: number, walk: number): RigDocument => ({
  ...rig,
  noise: { readout_rad: readout, walk_rad_per_sqrt_min: walk },
});

/** A teaching rig, an enthusiast's (physics.md J3), and a slow quiet one that the readout limits. */
export const plannedRigs: Record<string, RigDocument> = {
  teaching: withNoise(demoRigWide, 2e-5 * Math.sqrt(rateHz), 3e-6),
  enthusiast: withNoise(demoRigNarrow, 5e-6, 1e-6),
  slow: withNoise(
    {
      ...demoRigWide,
      measured: { ...demoRigWide.measured, period_s: { value: 900, u: 0.1, unit: 's' }, decayTime_s: { value: 1500, u: 10, unit: 's' } },
    },
    3e-5,
    5e-8,
  ),
};

export interface Planned {
  rig: string;
  strategy: Alternative['strategy'];
  dwells: number;
  /** Scatter of near minus far over the simulated nights by the planned uncertainty. */
  ratio: number;
  /** The same of G, as near minus far and the torsion constant by the same night's period and decay give it. */
  ratioOfG: number;
}

/** Whole periods from swing to swing, or one period of calm after waiting until the ringing has died to a hundredth. */
function cadenceOf({ periodS, gamma }: Oscillator, strategy: Planned['strategy']): Cadence {
  const dead = { plain: moveS, shaped: moveS + periodS / 2, wait: moveS + Math.log(100) / gamma }[strategy];
  const cycleS = { plain: periodS, shaped: 2 * periodS, wait: dead + periodS }[strategy];
  const calibrations = [{ amplitudeRad: ringDown.amplitudeRad, lengthS: ringDown.periods * periodS }];
  return { dwells: Math.floor(nightS / cycleS), dwellS: cycleS - dead, cycleS, calibrations, rings: strategy === 'plain' };
}

/** Every strategy on every rig with so many simulated nights of twelve hours. */
export function heldAgainstPlan(nights: number): Planned[] {
  let seed = 0;
  return Object.entries(plannedRigs).flatMap(([name, rig]) => {
    const oscillator = oscillatorOf(rig) as Oscillator;
    return (Object.keys(ringing) as Planned['strategy'][]).map((strategy) => {
      const cadence = cadenceOf(oscillator, strategy);
      const signalRad = predictSignal(rig)?.signalRad ?? NaN;
      const found = Array.from({ length: nights }, () =>
        difference(rig, { oscillator, cadence, signalRad, ringingRad: ringing[strategy] * signalRad, seed: (seed += 1) }),
      );
      const scatter = (of: (night: Found) => number) => Math.sqrt(found.reduce((sum, night) => sum + of(night) ** 2, 0) / nights);
      return {
        rig: name,
        strategy,
        dwells: cadence.dwells,
        ratio: scatter(({ rad }) => rad - signalRad) / (differenceU(rig, cadence, signalRad) as number),
        ratioOfG: scatter(({ rad, kappa }) => (rad * kappa) / (signalRad * oscillator.omega0 ** 2) - 1) / plannedOfG(rig, cadence),
      };
    });
  });
}

/** Relative u of G by plan, of what the night alone tells: nothing was measured beforehand. */
function plannedOfG(rig: RigDocument, cadence: Cadence): number {
  const { period_s: period, decayTime_s: decay } = rig.measured ?? {};
  if (period === undefined || decay === undefined) throw new Error('the planned rigs have a measured pendulum');
  const measured = { period_s: { ...period, u: 1e3 * period.value }, decayTime_s: { ...decay, u: 1e3 * decay.value } };
  const { bySource } = predictU({ ...rig, measured }, cadence) as PredictedU;
  return Math.hypot(...['reversal_rad', 'period_s', 'decayTime_s', togetherSource].map((source) => bySource[source] ?? 0));
}

/** Of the ratios: how far the plan is off on the whole. */
export const geometricMean = (ratios: readonly number[]) =>
  Math.exp(ratios.reduce((sum, ratio) => sum + Math.log(ratio), 0) / ratios.length);

interface Night {
  oscillator: Oscillator;
  cadence: Cadence;
  signalRad: number;
  ringingRad: number;
  seed: number;
}

interface Found {
  /** Near minus far. */
  rad: number;
  /** ω² + γ², rad2/s2: the torsion constant by the moment of inertia. */
  kappa: number;
}

/** What one night tells. */
function difference(rig: RigDocument, night: Night): Found {
  const { omegaD, gamma, periodS } = night.oscillator;
  const { dwells, dwellS, cycleS } = night.cadence;
  const [white, walk] = seededStreams(night.seed, 2) as [GaussianSource, GaussianSource];
  // Neighbouring seeds begin alike; after a while the generator has forgotten that.
  for (const stream of [white, walk]) for (let k = 0; k < 200; k += 1) stream.next();
  let zero = 0;
  const wander = (spanS: number) => (zero += (rig.noise?.walk_rad_per_sqrt_min ?? 0) * Math.sqrt(spanS / 60) * walk.next());
  const stretch = (lengthS: number, restRad: number, amplitudeRad: number): SeparableSegment => {
    const count = Math.round((lengthS / periodS) * binsPerPeriod);
    const binS = lengthS / count;
    const datumU = (rig.noise?.readout_rad ?? 0) / Math.sqrt(rateHz * binS);
    const tS = Float64Array.from({ length: count }, (_, k) => (k + 0.5) * binS);
    const y = tS.map((t) => {
      const wandered = (wander(binS / 2) + wander(binS / 2)) / 2;
      return restRad + wandered + amplitudeRad * Math.exp(-gamma * t) * Math.cos(omegaD * t) + datumU * white.next();
    });
    return ringDownSegment({ tS, y });
  };
  const calibration = stretch(ringDown.periods * periodS, 0, ringDown.amplitudeRad);
  const segments = Array.from({ length: dwells }, (_, k) => {
    wander(cycleS - dwellS);
    const side = k % 2 === 0 ? 1 : -1;
    return stretch(dwellS, (side * night.signalRad) / 2, -side * night.ringingRad);
  });
  const fit = fitSeparable([calibration, ...segments], [omegaD, gamma]);
  const { value } = abaDifference(
    fit.segments.slice(1).map(({ coefficients }, k) => ({
      timeS: k * cycleS,
      side: k % 2 === 0 ? (1 as const) : (-1 as const),
      value: coefficients[offset] as number,
    })),
  );
  return { rad: value, kappa: fit.alpha.reduce((sum, one) => sum + one * one, 0) };
}
