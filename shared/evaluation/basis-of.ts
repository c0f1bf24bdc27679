import type { Analysis } from './analysis';
import type { Known } from './free-oscillator';
import type { GBasis, StoredKnown } from './g-basis';
import { centreOf } from './ring-down-fit';

/** Null where the analysis came to no G. */
export function basisOf({ segments, found, measured, free, reversal, scale, solution }: Analysis): GBasis | null {
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
    known: {
      reversal: reversal.known === null ? null : stored(reversal.known),
      period: stored(free.period),
      decayTime: free.decayTime === null ? null : stored(free.decayTime),
    },
  };
}

const stored = ({ value, u, nu }: Known): StoredKnown => ({ value, u, nu: Number.isFinite(nu) ? nu : null });
