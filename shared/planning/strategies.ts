import { oscillatorOf } from '../physics/oscillator';
import { swingMove, UnplayableStep } from '../protocol/durations';
import { predictSignal } from '../protocol/predict';
import { sideAt } from '../protocol/stations';
import type { Timeline } from '../protocol/timeline';
import type { RigDocument } from '../rig/document';
import { calibrationsOf } from './calibration';
import { differenceU, type Cadence } from './night-noise';
import { predictU, type PredictedU } from './plan-uncertainty';

/** The cadence of a plan, and what other ways of spending the same time would give. */

/** Null where the plan has no reversals. */
export function cadenceOf({ items }: Pick<Timeline, 'items'>, rig: RigDocument): Cadence | null {
  const dwells = items.filter(({ kind, angleToDeg }) => kind === 'dwell' && sideAt(rig, angleToDeg) !== null);
  const first = dwells[0];
  const last = dwells.at(-1);
  const sides = new Set(dwells.map(({ angleToDeg }) => sideAt(rig, angleToDeg)));
  if (first === undefined || last === undefined || sides.size < 2) return null;
  const total = dwells.reduce((sum, { startUtcMs, endUtcMs }) => sum + (endUtcMs - startUtcMs) / 1000, 0);
  const between = (last.startUtcMs - first.startUtcMs) / 1000 / Math.max(1, dwells.length - 1);
  const dwellS = total / dwells.length;
  const oscillator = oscillatorOf(rig);
  return {
    dwells: dwells.length,
    dwellS,
    cycleS: Math.max(dwellS, between),
    calibrations: oscillator === null ? [] : calibrationsOf(items, rig, oscillator),
    rings: true,
  };
}

export interface Alternative {
  strategy: 'plain' | 'shaped' | 'wait';
  dwell_s: number;
  duration_s: number;
  relativeU: number;
}

/** The best of a strategy with the cadence that makes it. */
export interface StrategyNight {
  strategy: Alternative['strategy'];
  cadence: Cadence;
  predicted: PredictedU;
}

/** Ringing that has died to this fraction counts as settled. */
const settledShare = 0.01;
const mostPeriods = 8;

function swingS(rig: RigDocument): number | null {
  const [near, far] = [rig.stations.near?.value, rig.stations.far?.value];
  if (near === undefined || far === undefined) return null;
  try {
    return swingMove({ to: 'near' }, rig, far).durationS;
  } catch (error) {
    if (error instanceof UnplayableStep) return null;
    throw error;
  }
}

/** The best of each strategy in the same time, as `plan` prints it. */
export function alternatives(rig: RigDocument, night: { durationS: number; calibrations: Cadence['calibrations'] }): Alternative[] {
  return strategyNights(rig, night).map(({ strategy, cadence: { dwells, dwellS, cycleS }, predicted: { relativeU } }) => ({
    strategy,
    dwell_s: dwellS,
    duration_s: dwells * cycleS,
    relativeU,
  }));
}

/**
 * The best of each strategy in the same time: fitting through the ringing at a beat of whole periods, swings in two moves, and waiting
 * until the ringing has died to a hundredth. Empty where the rig does not tell. Only the dwells' noise hangs on the cadence, so the rest of
 * the budget is worked out for the best alone.
 */
export function strategyNights(
  rig: RigDocument,
  { durationS, calibrations }: { durationS: number; calibrations: Cadence['calibrations'] },
): StrategyNight[] {
  const oscillator = oscillatorOf(rig);
  const moveS = swingS(rig);
  const signalRad = predictSignal(rig)?.signalRad;
  if (oscillator === null || moveS === null || signalRad === undefined || !(signalRad > 0) || !(durationS > 0)) return [];
  const { periodS, gamma } = oscillator;
  const dead: Record<Alternative['strategy'], number> = {
    plain: moveS,
    shaped: moveS + periodS / 2,
    wait: moveS + Math.log(1 / settledShare) / gamma,
  };
  return (Object.keys(dead) as Alternative['strategy'][]).flatMap((strategy) => {
    const candidates = Array.from({ length: mostPeriods }, (_, k) => k + 1)
      // One period is too short to tell ω and γ by without a calibration.
      .filter((periods) => strategy !== 'plain' || calibrations.length > 0 || periods > 1)
      .flatMap((periods) => {
        const dwellS =
          strategy === 'wait' ? periods * periodS : Math.ceil((dead[strategy] + 1) / periodS + periods - 1) * periodS - dead[strategy];
        const cycleS = dwellS + dead[strategy];
        const cadence: Cadence = { dwells: Math.floor(durationS / cycleS), dwellS, cycleS, calibrations, rings: strategy === 'plain' };
        const u = differenceU(rig, cadence, signalRad);
        return u === null ? [] : [{ cadence, u }];
      });
    if (candidates.length === 0) return [];
    const { cadence } = candidates.reduce((a, b) => (b.u < a.u ? b : a));
    const predicted = predictU(rig, cadence);
    return predicted !== null && (predicted.statistics > 0 || predicted.relativeU > 0) ? [{ strategy, cadence, predicted }] : [];
  });
}
