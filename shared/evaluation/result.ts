import * as z from 'zod';
import { clockChoiceSchema } from './clock-choice';

/** What `evaluate` prints: the names, units and nulls of the archive format. u is a standard uncertainty (k = 1). */

const withU = z.strictObject({ value: z.number(), u: z.number() });

/** The test of an empty control; null in a place: it cannot be told. */
const controlResultSchema = z.strictObject({
  expected_rad: z.number(),
  bound_rad: z.number().nullable(),
  p: z.number().nullable(),
  equivalent: z.boolean().nullable(),
});
export type ControlResult = z.infer<typeof controlResultSchema>;

/** A still night's false near minus far, rad, and the overlapping Allan deviation of its dwells. */
const pretendResultSchema = z.strictObject({
  value: z.number(),
  u: z.number().nullable(),
  count: z.number().int(),
  allan: z.array(z.strictObject({ tau_s: z.number(), deviation_rad: z.number(), u: z.number().optional() })),
});
export type PretendResult = z.infer<typeof pretendResultSchema>;

const dwellResultSchema = z.strictObject({
  seq: z.number().int(),
  station: z.string(),
  /** Fitted centre at mid-dwell, drift not removed. */
  theta_rad: withU.nullable(),
  samples: z.number().int(),
  used: z.boolean(),
  why: z.string().nullable(),
});

const budgetLineSchema = z.strictObject({
  input: z.string(),
  value: z.number(),
  u: z.number(),
  /** dG/dinput in the input's unit. */
  sensitivity: z.number(),
  contribution: z.number(),
  share: z.number(),
});

const differenceAndG = z.strictObject({
  reversal_rad: withU,
  G: z.strictObject({ value: z.number(), u: z.number().nullable() }).nullable(),
});

/** What would change if the part that goes with a channel of the surroundings were taken off; offered beside the result, never in it. */
const regressionResultSchema = z.strictObject({
  channel: z.string(),
  /** Unit of the channel. */
  unit: z.string(),
  /** Near and far dwells in which the channel has samples. */
  dwells: z.number().int(),
  /** Of the scatter that the u of the coefficient comes from. */
  degreesOfFreedom: z.number(),
  /** Pendulum angle over the channel's mean in a dwell. */
  coefficient: z.strictObject({ value: z.number(), u: z.number(), unit: z.string() }),
  without: differenceAndG,
  with: differenceAndG,
});
export type RegressionResult = z.infer<typeof regressionResultSchema>;

const methods = ['equilibrium', 'period', 'acceleration', 'modulation'] as const;

/** What another method makes of the same run. */
const methodResultSchema = z.strictObject({
  method: z.enum(methods),
  G: z.strictObject({ value: z.number(), u: z.number().nullable(), degreesOfFreedom: z.number().nullable() }).nullable(),
  relativeU: z.number().nullable(),
  /** Against CODATA 2022. */
  En: z.number().nullable(),
  /** Its G minus that of the result; u without what the two share. Null for the method of the result. */
  difference: z.strictObject({ value: z.number(), u: z.number().nullable() }).nullable(),
  /** Why it gives no G. */
  why: z.string().nullable(),
});
export type MethodResult = z.infer<typeof methodResultSchema>;

/** Near minus far with the drift taken off in one way: ABA windows, a polynomial, or generalised least squares against a zero that walks. */
const driftResultSchema = z.strictObject({
  drift: z.enum(['aba', 'polynomial', 'gls']),
  reversal_rad: z.strictObject({ value: z.number(), u: z.number().nullable() }),
});
export type DriftResult = z.infer<typeof driftResultSchema>;

export const evaluationResultSchema = z.strictObject({
  formatVersion: z.literal(1),
  method: z.enum(methods),
  registered: z.boolean().nullable(),
  chain: z.strictObject({ events: z.number().int(), valid: z.literal(true).nullable() }),
  alignment: z
    .strictObject({
      clockOffset_s: withU.nullable(),
      applied: z.boolean(),
      /** What somebody decided; absent: as the data tell it. */
      decided: clockChoiceSchema.optional(),
      /** Absent where it was not tried, or the data tell no offset: G if this offset had been taken off instead, s. */
      otherwise: z.strictObject({ offset_s: z.number(), G: z.number().nullable() }).optional(),
    })
    .nullable(),
  period_s: withU.nullable(),
  decayTime_s: withU.nullable(),
  kappa_N_m: withU.nullable(),
  dwells: z.array(dwellResultSchema),
  reversal_rad: z
    .strictObject({ value: z.number(), u: z.number().nullable(), count: z.number().int(), equivalence: controlResultSchema.optional() })
    .nullable(),
  G: z.strictObject({ value: z.number(), u: z.number().nullable(), degreesOfFreedom: z.number().nullable() }).nullable(),
  relativeU: z.number().nullable(),
  codata: z.strictObject({ value: z.number(), u: z.number(), En: z.number().nullable() }),
  budget: z.array(budgetLineSchema).nullable(),
  monteCarlo: z
    .strictObject({
      trials: z.number().int(),
      G_mean: z.number().nullable(),
      G_u: z.number().nullable(),
      interval95: z.tuple([z.number(), z.number()]).nullable(),
      /** Of the ends of the interval, from the number of trials; absent from results of earlier versions. */
      interval95_u: z.tuple([z.number(), z.number()]).nullable().optional(),
    })
    .nullable(),
  /** Of the modulation method alone: whole turns that were looked at, and half the swing at twice the turntable's angle. */
  modulation: z
    .strictObject({ turns: z.number().int(), amplitude_rad: z.strictObject({ value: z.number(), u: z.number().nullable() }) })
    .optional(),
  pretend: pretendResultSchema.nullable().optional(),
  /** Absent where no channel of the surroundings could be compared. */
  regressions: z.array(regressionResultSchema).optional(),
  /** Absent where the other methods were not tried. */
  methods: z.array(methodResultSchema).optional(),
  /** Absent where the other ways of taking the drift off were not tried, or there is no difference of dwells. */
  drifts: z.array(driftResultSchema).optional(),
  warnings: z.array(z.strictObject({ code: z.string(), message: z.string() })),
});
export type EvaluationResult = z.infer<typeof evaluationResultSchema>;
export type BudgetLine = z.infer<typeof budgetLineSchema>;
export type DwellResult = z.infer<typeof dwellResultSchema>;

/** What screens draw beside the result: the binned data of each dwell and the fitted curve through them. */
export const fitCurveSchema = z.strictObject({
  seq: z.number().int(),
  station: z.string(),
  startUtcMs: z.number(),
  /** Seconds after `startUtcMs`. */
  tS: z.array(z.number()),
  dataRad: z.array(z.number()),
  modelRad: z.array(z.number()),
});
export type FitCurve = z.infer<typeof fitCurveSchema>;
