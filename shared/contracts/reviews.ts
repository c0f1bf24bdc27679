import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** What sets masses in motion is reviewed first: the review gives a token that counts once, for this very act, within 30 s. */

/** `serverAt` teaches the page the server's clock just before the tap that has to be fresh by it. */
const reviewed = { token: z.string(), expiresAt: instantSchema, serverAt: instantSchema };
const remaining = {
  /** Dwells still to come, one that is begun anew included. */
  dwellsLeft: z.number().int(),
  finishAt: instantSchema,
  /** The step that begins first; null: the run is at its end. */
  next: z.strictObject({ path: z.string(), kind: z.string(), label: z.string(), station: z.string() }).nullable(),
  /** In words; `nothing moves` where nothing does. */
  firstMove: z.string(),
  /** Relative standard uncertainty of G as the plan has it, not measured: after the dwells done, and at the finish; null: the rig does not tell. */
  plannedU: z.strictObject({ soFar: z.number().nullable(), atEnd: z.number().nullable() }),
};

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
  response: z.strictObject({ ...reviewed, ...remaining }),
  problems: ['not-found', 'not-possible-now'],
});

export const reviewSkip = defineRoute({
  name: 'reviewSkip',
  summary: 'Review a skip: what it leaves out, what it breaks, the plan after it, and the token that the skip needs, good once within 30 s',
  method: 'POST',
  path: '/labs/:labId/runs/:runId/skip-review',
  access: 'run.resume',
  status: 201,
  /** Row of the step that is to be left out. */
  body: z.strictObject({ seq: z.number().int().positive() }),
  response: z.strictObject({
    ...reviewed,
    ...remaining,
    seq: z.number().int(),
    path: z.string(),
    kind: z.string(),
    label: z.string(),
    station: z.string(),
    /** How much of it would be left out, s. */
    leftS: z.number(),
    /** Path of the dwell that would be left without its pair, and so not good; null: none. */
    notGoodPath: z.string().nullable(),
  }),
  problems: ['invalid-input', 'not-found', 'not-possible-now'],
});
