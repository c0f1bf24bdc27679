import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** At most so many stretches of a run are in force at once. */
export const mostExclusions = 200;

const reasonSchema = z.string().trim().min(3).max(500);
const actSchema = z.strictObject({ at: instantSchema, by: z.string(), reason: z.string() });

/** A stretch of a run whose samples no evaluation uses while it is in force. It is kept for ever, also once withdrawn. */
export const exclusionViewSchema = z.strictObject({
  id: idSchema,
  runId: idSchema,
  /** UTC ms, as in the step log; both ends belong to it. */
  startUtcMs: z.number(),
  endUtcMs: z.number(),
  made: actSchema,
  /** Null while it is in force. */
  withdrawn: actSchema.nullable(),
});
export type ExclusionView = z.infer<typeof exclusionViewSchema>;

export const listExclusions = defineRoute({
  name: 'listExclusions',
  summary: 'Stretches of a run that are or were excluded, earliest first',
  method: 'GET',
  path: '/labs/:labId/runs/:runId/exclusions',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(exclusionViewSchema) }),
  problems: ['not-found'],
});
export const makeExclusion = defineRoute({
  name: 'makeExclusion',
  summary: 'Exclude the samples of a stretch of a run from its next evaluations, with a reason; nothing is deleted',
  method: 'POST',
  path: '/labs/:labId/runs/:runId/exclusions',
  access: 'data.exclude',
  status: 201,
  idempotent: true,
  body: z.strictObject({ startUtcMs: z.number(), endUtcMs: z.number(), reason: reasonSchema }),
  response: exclusionViewSchema,
  problems: ['invalid-input', 'not-found', 'not-possible-now', 'already-exists'],
});
export const withdrawExclusion = defineRoute({
  name: 'withdrawExclusion',
  summary: 'Withdraw an exclusion, with a reason: the next evaluations use its samples again',
  method: 'POST',
  path: '/labs/:labId/exclusions/:exclusionId/withdraw',
  access: 'data.exclude',
  status: 200,
  body: z.strictObject({ reason: reasonSchema }),
  response: exclusionViewSchema,
  problems: ['invalid-input', 'not-found', 'not-possible-now'],
});
