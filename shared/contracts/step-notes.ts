import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** What somebody wrote to a row of the step log. It is never changed: who was wrong writes another. */
export const stepNoteSchema = z.strictObject({
  id: idSchema,
  /** Row of the step log. */
  seq: z.number().int(),
  text: z.string(),
  at: instantSchema,
  by: z.string(),
});
export type StepNoteView = z.infer<typeof stepNoteSchema>;

/** Rows are numbered in 32 bits. */
const greatestSeq = 2_147_483_647;

const path = '/labs/:labId/runs/:runId/notes';

export const listStepNotes = defineRoute({
  name: 'listStepNotes',
  summary: 'Notes to the rows of a step log, by row and time',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(stepNoteSchema) }),
  problems: ['not-found'],
});
export const writeStepNote = defineRoute({
  name: 'writeStepNote',
  summary: 'Write a note to a row of the step log; it stays with your name and the time',
  method: 'POST',
  path,
  access: 'data.annotate',
  status: 201,
  idempotent: true,
  body: z.strictObject({ seq: z.number().int().positive().max(greatestSeq), text: z.string().trim().min(1).max(2000) }),
  response: stepNoteSchema,
  problems: ['invalid-input', 'not-found', 'not-possible-now'],
});
