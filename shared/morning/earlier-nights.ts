import type { MorningNight } from '../contracts/morning';
import { combined, type Combined } from '../statistics/between-groups';

/** One night beside those before it. */

interface WithU {
  value: number;
  u: number | null;
}

/** Difference of two nights over the standard uncertainty of that difference, both scatters taken as independent; null without a u. */
export function differenceInU(one: WithU, other: WithU): number | null {
  if (one.u === null || other.u === null) return null;
  const u = Math.hypot(one.u, other.u);
  return u === 0 ? null : Math.abs(one.value - other.value) / u;
}

/**
 * Quality factor Q = ω₀/2γ of a night, of its damped period T and decay time τ: Q² = (πτ/T)² + ¼. Its u is null where one of theirs is; null
 * where one of them was not found.
 */
export function qualityOf({ period_s, decayTime_s }: Pick<MorningNight, 'period_s' | 'decayTime_s'>): WithU | null {
  if (period_s === null || decayTime_s === null) return null;
  const cycles = (Math.PI * decayTime_s.value) / period_s.value;
  const value = Math.hypot(cycles, 0.5);
  if (period_s.u === null || decayTime_s.u === null) return { value, u: null };
  const relativeU = Math.hypot(decayTime_s.u / decayTime_s.value, period_s.u / period_s.value);
  return { value, u: (cycles ** 2 / value) * relativeU };
}

/** Mean of what the nights with source masses have of a quantity; null where none has it. */
export function meanBefore(earlier: readonly MorningNight[], pick: (night: MorningNight) => WithU | null): number | null {
  const values = earlier.flatMap((night) => {
    const found = night.control ? null : pick(night);
    return found === null ? [] : [found.value];
  });
  return values.length === 0 ? null : values.reduce((sum, value) => sum + value, 0) / values.length;
}

/** Fewer nights do not tell whether they scatter more than their u say. */
const enoughNights = 3;

/** Near minus far of this night and of those before it that were of its kind, with masses or without; null where fewer than three have a u. */
export function nightsTogether(tonight: MorningNight, earlier: readonly MorningNight[]): (Combined & { nights: number }) | null {
  const values = [tonight, ...earlier.filter(({ control }) => control === tonight.control)].flatMap(({ reversal_rad: { value, u } }) =>
    u !== null && u > 0 ? [{ value, u }] : [],
  );
  const found = values.length < enoughNights ? null : combined(values);
  return found === null ? null : { ...found, nights: values.length };
}
