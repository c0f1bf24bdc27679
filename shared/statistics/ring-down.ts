import type { Basis, BasisDerivative, SeparableSegment } from './variable-projection';

/**
 * The dwell model: y = c₀ + c₁ (t − t₀) + e^(−γt) (A cos ωᵢt + B sin ωᵢt), with ω and γ shared by all segments and
 * ωᵢ² = ω² + shiftᵢ, where the sources stiffen or soften the pendulum.
 */
export interface RingDownData {
  /** Seconds from the segment's start. */
  tS: Float64Array;
  y: Float64Array;
  /** Number of samples behind each datum (its weight); absent: all alike. */
  weight?: Float64Array;
  /** Time at which c₀ is the centre, s; absent: the mean of `tS`. */
  centreS?: number;
  /** Instants (s) at which something knocked the pendulum: from each on the oscillation has a further cosine and sine. */
  knocksS?: readonly number[];
  /** What the sources add to ω², rad2/s2; absent: 0. */
  shift?: number;
}

/** Order of the linear coefficients of a segment; each knock adds a cosine and a sine. */
export const offset = 0;
export const slope = 1;
export const cosine = 2;
export const sine = 3;

/** A segment for `fitSeparable` with the parameters [ω (rad/s), γ (1/s)]. */
export function ringDownSegment(data: RingDownData): SeparableSegment {
  const { tS, y, shift = 0, knocksS = [] } = data;
  const centreS = data.centreS ?? mean(tS);
  return {
    y,
    ...(data.weight === undefined ? {} : { rootWeight: data.weight.map(Math.sqrt) }),
    basis: ([omega, gamma]) =>
      ringDownBasis(tS, centreS, {
        omega: Math.sqrt((omega as number) ** 2 + shift),
        slope: (omega as number) / Math.sqrt((omega as number) ** 2 + shift),
        gamma: gamma as number,
        knocksS,
      }),
  };
}

interface BasisAt {
  omega: number;
  slope: number;
  gamma: number;
  knocksS: readonly number[];
}

function ringDownBasis(tS: Float64Array, centreS: number, at: BasisAt): Basis {
  const { omega, gamma, knocksS } = at;
  const { exp, cos, sin } = Math;
  const n = tS.length;
  const one = new Float64Array(n).fill(1);
  const time = new Float64Array(n);
  const c = new Float64Array(n);
  const s = new Float64Array(n);
  for (let i = 0; i < n; i += 1) {
    const t = tS[i] as number;
    const decay = exp(-gamma * t);
    time[i] = t - centreS;
    c[i] = decay * cos(omega * t);
    s[i] = decay * sin(omega * t);
  }
  const later = knocksS.flatMap((knockS) => [from(tS, knockS, c), from(tS, knockS, s)]);
  return { columns: [one, time, c, s, ...later], derivatives: () => ringDownDerivatives(tS, { c, s }, at) };
}

/** The values from an instant on, 0 before. */
function from(tS: Float64Array, knockS: number, values: Float64Array): Float64Array {
  const later = new Float64Array(values.length);
  for (let i = 0; i < later.length; i += 1) if (!((tS[i] as number) < knockS)) later[i] = values[i] as number;
  return later;
}

/** d cos/dω = −t sin, d sin/dω = t cos, d/dγ = −t, each with the decay. */
function ringDownDerivatives(tS: Float64Array, { c, s }: { c: Float64Array; s: Float64Array }, at: BasisAt): BasisDerivative[] {
  const { slope: bySlope, knocksS } = at;
  const [cosineByOmega, sineByOmega, cosineByGamma, sineByGamma] = Array.from({ length: 4 }, () => new Float64Array(tS.length)) as [
    Float64Array,
    Float64Array,
    Float64Array,
    Float64Array,
  ];
  for (let i = 0; i < tS.length; i += 1) {
    const tc = (tS[i] as number) * (c[i] as number);
    const ts = (tS[i] as number) * (s[i] as number);
    cosineByOmega[i] = -bySlope * ts;
    sineByOmega[i] = bySlope * tc;
    cosineByGamma[i] = -tc;
    sineByGamma[i] = -ts;
  }
  const first: BasisDerivative[] = [
    { column: cosine, parameter: 0, values: cosineByOmega },
    { column: sine, parameter: 0, values: sineByOmega },
    { column: cosine, parameter: 1, values: cosineByGamma },
    { column: sine, parameter: 1, values: sineByGamma },
  ];
  const later = knocksS.flatMap((knockS, k) =>
    first.map(({ column, parameter, values }) => ({ column: column + 2 * (k + 1), parameter, values: from(tS, knockS, values) })),
  );
  return [...first, ...later];
}

function mean(values: ArrayLike<number>): number {
  let sum = 0;
  for (let i = 0; i < values.length; i += 1) sum += values[i] as number;
  return sum / values.length;
}
