import type { Analysis } from './analysis';
import { at } from '../statistics/symmetric';
import type { Known } from './free-oscillator';
import type { GBasis, StoredKnown } from './g-basis';
import type { Reversal } from './reversal';
import { centreOf } from './ring-down-fit';

/** Null where the analysis came to no G. */
export function basisOf({ segments, found, measured, free, reversal, scale, solution, calibration }: Analysis): GBasis | null {
  if (solution === null || reversal === null) return null;
  const ringDown = found?.ringDown ?? null;
  const valueOf = (known: Known | null) => (known === null ? null : { value: known.value });
  return {
    bigG: solution.bigG,
    segments: segments.map(({ window: { angleDeg, stationKey }, shift }, i) => ({
      window: { angleDeg, stationKey },
      shift,
      centreRad: found === null ? 0 : centreOf(found, i).value,
    })),
    found:
      found === null
        ? null
        : {
            ringDown:
              ringDown === null
                ? null
                : {
                    omega: ringDown.omega,
                    gamma: ringDown.gamma,
                    omegaByShift: ringDown.omegaByShift,
                    gammaByShift: ringDown.gammaByShift,
                  },
          },
    measured: { omega: valueOf(measured.omega), gamma: valueOf(measured.gamma) },
    free: { ringDownShare: free.ringDownShare },
    reversal: { value: reversal.value, members: reversal.members },
    scale,
    ...(calibration === null ? {} : { calibration: { slope: calibration.slope, uSlope: calibration.uSlope } }),
    known: {
      reversal: reversal.known === null ? null : stored(reversal.known),
      period: stored(free.period),
      decayTime: free.decayTime === null ? null : stored(free.decayTime),
    },
    ...togetherOf({ found, free, reversal }),
  };
}

/** A coefficient from few dwells may come out beyond what is possible. */
const greatestCorrelation = 0.95;

/** Period and decay time fall where ω and γ rise; only the ring-down's share in them errs together with the difference. */
function togetherOf({ found, free, reversal }: Pick<Analysis, 'found' | 'free'> & { reversal: Reversal }): Pick<GBasis, 'together'> {
  const ringDown = found?.ringDown ?? null;
  const { known, withRingDown } = reversal;
  if (ringDown === null || known === null || withRingDown === null || free.decayTime === null) return {};
  const { omega: ofOmega, gamma: ofGamma } = free.ringDownShare;
  const omegaU = (2 * Math.PI * free.period.u) / free.period.value ** 2;
  const gammaU = free.decayTime.u / free.decayTime.value ** 2;
  const coefficient = (covariance: number, u: number) =>
    u > 0 ? Math.max(-greatestCorrelation, Math.min(greatestCorrelation, covariance / u)) : 0;
  return {
    together: {
      reversalPeriod: coefficient(-ofOmega * withRingDown[0], known.u * omegaU),
      reversalDecayTime: coefficient(-ofGamma * withRingDown[1], known.u * gammaU),
      periodDecayTime: coefficient(ofOmega * ofGamma * at(ringDown.covariance, 0, 1), omegaU * gammaU),
    },
  };
}

const stored = ({ value, u, nu }: Known): StoredKnown => ({ value, u, nu: Number.isFinite(nu) ? nu : null });
