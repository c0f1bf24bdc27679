import * as z from 'zod';
import { gBasisSchema } from '../evaluation/g-basis';
import { clockChoiceSchema } from '../evaluation/clock-choice';
import { evaluationResultSchema, fitCurveSchema } from '../evaluation/result';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

export const evaluationViewSchema = z.strictObject({
  id: idSchema,
  runId: idSchema,
  state: z.enum(['queued', 'running', 'done', 'failed']),
  createdAt: instantSchema,
  createdBy: z.string(),
  channel: z.string().nullable(),
  error: z.string().nullable(),
  result: evaluationResultSchema.nullable(),
  curves: z.array(fitCurveSchema).nullable(),
  /** What G was computed from, to try values with; null without a G by equilibria. */
  basis: gBasisSchema.nullable(),
  /** Version of the software that computed the result; null where none was kept. */
  software: z.string().nullable(),
  /** The frozen evaluation that this one computes again. */
  recomputes: idSchema.nullable(),
  /** Who keeps it as it is, since when and why; there is no way back. */
  frozen: z.strictObject({ at: instantSchema, by: z.string(), reason: z.string() }).nullable(),
});
export type EvaluationView = z.infer<typeof evaluationViewSchema>;
export type ListedEvaluation = Omit<EvaluationView, 'curves' | 'basis'>;

export const startEvaluation = defineRoute({
  name: 'startEvaluation',
  summary: 'Evaluate a run that has ended',
  method: 'POST',
  path: '/labs/:labId/runs/:runId/evaluations',
  access: 'evaluate',
  status: 202,
  idempotent: true,
  body: z.strictObject({ channel: z.string().min(1).optional(), clock: clockChoiceSchema.optional() }),
  response: evaluationViewSchema,
  problems: ['invalid-input', 'not-found', 'not-possible-now', 'cannot-evaluate'],
});
export const listEvaluations = defineRoute({
  name: 'listEvaluations',
  summary: 'Evaluations of a run, newest first',
  method: 'GET',
  path: '/labs/:labId/runs/:runId/evaluations',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(evaluationViewSchema.omit({ curves: true, basis: true })) }),
  problems: ['not-found'],
});
export const getEvaluation = defineRoute({
  name: 'getEvaluation',
  summary: 'One evaluation with its fitted curves',
  method: 'GET',
  path: '/labs/:labId/evaluations/:evaluationId',
  access: 'read',
  status: 200,
  response: evaluationViewSchema,
  problems: ['not-found'],
});
export const freezeEvaluation = defineRoute({
  name: 'freezeEvaluation',
  summary: 'Freeze an evaluation for good, with a reason',
  method: 'POST',
  path: '/labs/:labId/evaluations/:evaluationId/freeze',
  access: 'evaluate',
  status: 200,
  idempotent: true,
  body: z.strictObject({ reason: z.string().trim().min(3, 'say why').max(500) }),
  response: evaluationViewSchema,
  problems: ['invalid-input', 'not-found', 'not-possible-now'],
});
export const recomputeEvaluation = defineRoute({
  name: 'recomputeEvaluation',
  summary: 'Compute a frozen evaluation again, from the run as it stands, to be compared with it',
  method: 'POST',
  path: '/labs/:labId/evaluations/:evaluationId/recomputations',
  access: 'evaluate',
  status: 202,
  idempotent: true,
  response: evaluationViewSchema,
  problems: ['not-found', 'not-possible-now'],
});
export const downloadReport = defineRoute({
  name: 'downloadReport',
  summary: 'The measurement report of an evaluation (PDF)',
  method: 'GET',
  path: '/labs/:labId/evaluations/:evaluationId/report.pdf',
  access: 'read',
  status: 200,
  produces: 'application/pdf',
  problems: ['not-found', 'not-possible-now'],
});
