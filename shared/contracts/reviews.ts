import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** What sets masses in motion is reviewed first: the review gives a token that counts once, for this very act, within 30 s. */

const reviewed = { token: z.string(), expiresAt: instantSchema };

export const reviewStart = defineRoute({
  name: 'reviewStart',
  summary: 'Review a start: gives the token that the start needs, good once within 30 s',
  method: 'POST',
  path: '/labs/:labId/rigs/:rigId/start-review',
  access: 'run.start',
  status: 201,
  body: z.strictObject({ protocolId: idSchema, revision: z.number().int().positive(), massSetId: idSchema }),
  response: z.strictObject(reviewed),
  problems: ['invalid-input', 'not-found'],
});

export const reviewResume = defineRoute({
  name: 'reviewResume',
  summary: 'Review a resume: the plan from here on, and the token that the resume needs, good once within 30 s',
  method: 'POST',
  path: '/labs/:labId/runs/:runId/resume-review',
  access: 'run.resume',
  status: 201,
  response: z.strictObject({
    ...reviewed,
    /** Dwells still to come, the one that is begun anew included. */
    dwellsLeft: z.number().int(),
    finishAt: instantSchema,
  }),
  problems: ['not-found', 'not-possible-now'],
});
