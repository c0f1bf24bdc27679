import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** Work that was tried again and again and then given up, for owners. */

export const givenUpJobSchema = z.strictObject({
  id: idSchema,
  /** Kind of work, for example `mail.schedule`. */
  kind: z.string(),
  attempts: z.number().int(),
  /** Words of the last failure. */
  lastError: z.string(),
  askedAt: instantSchema,
  givenUpAt: instantSchema,
});
export type GivenUpJob = z.infer<typeof givenUpJobSchema>;

const path = '/labs/:labId/given-up-jobs';

export const listGivenUpJobs = defineRoute({
  name: 'listGivenUpJobs',
  summary: 'Mails and other work of the last 30 days that were given up after many tries, newest first, at most 100',
  method: 'GET',
  path,
  access: 'lab.settings',
  status: 200,
  response: z.strictObject({ items: z.array(givenUpJobSchema) }),
  problems: ['not-found'],
});
export const retryJob = defineRoute({
  name: 'retryJob',
  summary: 'Try given-up work again, now and if need be twice more',
  method: 'POST',
  path: `${path}/:jobId/retry`,
  access: 'lab.settings',
  status: 204,
  idempotent: true,
  problems: ['not-found'],
});
