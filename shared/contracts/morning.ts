import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** What the morning after a night has to tell, read off its records: how it went, whether to believe it, what to do next. */

const withU = z.strictObject({ value: z.number(), u: z.number().nullable() });

export const tickCodes = ['first-pair', 'edge', 'samples', 'clock', 'record'] as const;

export const morningTickSchema = z.strictObject({
  code: z.enum(tickCodes),
  /** Null where it cannot be told. */
  ok: z.boolean().nullable(),
  /** What was found, with its figure. */
  words: z.string(),
});
export type MorningTick = z.infer<typeof morningTickSchema>;

/** Time that brought no data that count. */
export const morningLossSchema = z.strictObject({ words: z.string(), s: z.number() });
export type MorningLoss = z.infer<typeof morningLossSchema>;

/** One night as the newest evaluation of its run sees it. */
export const morningNightSchema = z.strictObject({
  runId: idSchema,
  startedAt: instantSchema,
  /** Run without source masses. */
  control: z.boolean(),
  reversal_rad: withU,
  period_s: withU.nullable(),
  decayTime_s: withU.nullable(),
  kappa_N_m: withU.nullable(),
});
export type MorningNight = z.infer<typeof morningNightSchema>;

export const morningMomentSchema = z.strictObject({
  /** Row of the step log. */
  seq: z.number().int(),
  at: instantSchema,
  words: z.string(),
  /** How much of the night it cost, s. */
  s: z.number(),
});
export type MorningMoment = z.infer<typeof morningMomentSchema>;

export const morningSheetSchema = z.strictObject({
  /** End of the run as planned at its start; null where the protocol leaves the end open. */
  plannedEndAt: instantSchema.nullable(),
  dwells: z.strictObject({ planned: z.number().int(), done: z.number().int(), good: z.number().int() }),
  /** The greatest first. */
  lost: z.array(morningLossSchema),
  ticks: z.array(morningTickSchema),
  /** This night by its newest evaluation; null before there is one that found near minus far. */
  tonight: morningNightSchema.nullable(),
  /** By the same evaluation, m3 kg-1 s-2. */
  G: withU.nullable(),
  /** Earlier nights on the rig that were evaluated, the newest first: five at most, and the newest control. */
  earlier: z.array(morningNightSchema),
  /** Wander of the pendulum's zero between dwells on one side, at the beginning and at the end, rad/h; null where it cannot be told. */
  drift: z.strictObject({ start: withU, end: withU }).nullable(),
  /** Channels of the surroundings within the run: least and greatest value, and near minus far of their means, in their units. */
  room: z.array(z.strictObject({ name: z.string(), unit: z.string(), least: z.number(), greatest: z.number(), inStep: withU.nullable() })),
  /** Shares of u²(G): what one more night makes smaller, and what only a measurement of the rig does. */
  shares: z.strictObject({ night: z.number(), geometry: z.number() }).nullable(),
  /** What cost most, three at most. */
  worst: z.array(morningMomentSchema),
  /** What to do before the next night, the most pressing first, three at most. */
  next: z.array(z.strictObject({ act: z.enum(['go', 'wait', 'first']), words: z.string() })),
});
export type MorningSheet = z.infer<typeof morningSheetSchema>;

export const readMorning = defineRoute({
  name: 'readMorning',
  summary: 'The morning sheet of a run that is over, or is held',
  method: 'GET',
  path: '/labs/:labId/runs/:runId/morning',
  access: 'read',
  status: 200,
  response: morningSheetSchema,
  problems: ['not-found', 'not-possible-now'],
});
