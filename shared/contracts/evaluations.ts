import * as z from 'zod';
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
});
export type EvaluationView = z.infer<typeof evaluationViewSchema>;

export const startEvaluation = defineRoute({
  name: 'startEvaluation',
  summary: 'Evaluate a run that has ended',
  method: 'POST',
  path: '/labs/:labId/runs/:runId/evaluations',
  access: 'evaluate',
  status: 202,
  idempotent: true,
  body: z.strictObject({ channel: z.string().min(1).optional() }),
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
  response: z.strictObject({ items: z.array(evaluationViewSchema.omit({ curves: true })) }),
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
