import * as z from 'zod';
import type { Known } from './free-oscillator';

/**
 * What G follows from once the data are fitted, as plain numbers that go through JSON without a loss: enough to ask, without the samples,
 * what G and its budget would be for a rig, a difference or a pendulum supposed otherwise. Angles in rad unless the name says deg.
 */

/** `nu` null: no degrees of freedom are stated. */
const knownSchema = z.strictObject({ value: z.number(), u: z.number(), nu: z.number().nullable() });
export type StoredKnown = z.infer<typeof knownSchema>;

const valueSchema = z.strictObject({ value: z.number() });
const leverSchema = z.strictObject({
  distanceM: z.number(),
  fold: z.number(),
  sense: z.union([z.literal(1), z.literal(-1)]),
  zeroM: z.number(),
});

export const gBasisSchema = z.strictObject({
  bigG: z.number(),
  segments: z.array(
    z.strictObject({
      window: z.strictObject({ angleDeg: z.number().nullable(), stationKey: z.string().nullable() }),
      /** What the sources add to ω² there, rad2/s2. */
      shift: z.number(),
      centreRad: z.number(),
    }),
  ),
  found: z
    .strictObject({
      ringDown: z
        .strictObject({ omega: z.number(), gamma: z.number(), omegaByShift: z.array(z.number()), gammaByShift: z.array(z.number()) })
        .nullable(),
    })
    .nullable(),
  measured: z.strictObject({ omega: valueSchema.nullable(), gamma: valueSchema.nullable() }),
  free: z.strictObject({ ringDownShare: z.strictObject({ omega: z.number(), gamma: z.number() }) }),
  reversal: z.strictObject({ value: z.number(), members: z.array(z.strictObject({ segment: z.number().int(), weight: z.number() })) }),
  scale: z.discriminatedUnion('kind', [
    z.strictObject({ kind: z.literal('angle'), radPerUnit: z.number() }),
    z.strictObject({ kind: z.literal('spot'), metresPerUnit: z.number(), lever: leverSchema, zeroGiven: z.boolean() }),
  ]),
  /** Slope of the channel's calibration, by which the readings were multiplied already; absent where there is none. */
  calibration: z.strictObject({ slope: z.number(), uSlope: z.number() }).optional(),
  /** `reversal` null: too few dwells to judge their scatter by, so there is no budget. */
  known: z.strictObject({ reversal: knownSchema.nullable(), period: knownSchema, decayTime: knownSchema.nullable() }),
  /** Correlation coefficients of what the same dwells tell; absent in evaluations of older versions, and where nothing rang. */
  together: z.strictObject({ reversalPeriod: z.number(), reversalDecayTime: z.number(), periodDecayTime: z.number() }).optional(),
});
export type GBasis = z.infer<typeof gBasisSchema>;

export const fromStored = ({ value, u, nu }: StoredKnown): Known => ({ value, u, nu: nu ?? Infinity });
