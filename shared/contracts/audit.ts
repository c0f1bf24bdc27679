import * as z from 'zod';
import { localDateSchema } from '../schedule/plan';
import { idSchema, instantSchema, pageOf, pageQuerySchema } from './common';
import { defineRoute } from './route';

/** The audit chain of a lab: all that people did, for owners. */

/** Who did something: the id of an account, or the server itself. */
export const server = 'server';

export const auditEntrySchema = z.strictObject({
  seq: z.number().int(),
  at: instantSchema,
  who: z.string(),
  kind: z.string(),
  data: z.record(z.string(), z.unknown()),
  hash: z.string(),
});
export type AuditEntry = z.infer<typeof auditEntrySchema>;

const path = '/labs/:labId/audit';

export const listAudit = defineRoute({
  name: 'listAudit',
  summary: 'The audit chain of the lab, newest first; by person, by what was done and by days of the lab’s zone',
  method: 'GET',
  path,
  access: 'members.manage',
  status: 200,
  query: pageQuerySchema.extend({
    who: z.union([z.literal(server), z.uuid('an account, or “server”')]).optional(),
    /** One kind of act, for example `run.started`, or all that begin so: `run`. */
    kind: z
      .string()
      .max(60)
      .regex(/^[a-z-]+(\.[a-z-]+)?$/, 'for example run or run.started')
      .optional(),
    /** First day. */
    from: localDateSchema.optional(),
    /** Last day, the whole of it. */
    until: localDateSchema.optional(),
  }),
  response: pageOf(auditEntrySchema),
  problems: ['invalid-input', 'not-found'],
});

export const auditCheckSchema = z.strictObject({
  /** Whether every entry that was followed is right. */
  valid: z.boolean(),
  /** The last entry that is right with all before it; 0 where there is none. */
  upToSeq: z.number().int(),
  /** Its hash; empty where there is none. */
  hash: z.string(),
  /** The first entry that is not right. */
  broken: z.strictObject({ seq: z.number().int(), why: z.string() }).nullable(),
  /** False where the chain is longer than a page of the server follows: the rest is left to the command `audit-verify`. */
  complete: z.boolean(),
  checkedAt: instantSchema,
  /** Everybody who stands in it. */
  people: z.array(z.strictObject({ id: z.union([idSchema, z.literal(server)]), name: z.string() })),
  /** Every kind of act that stands in it. */
  kinds: z.array(z.string()),
});
export type AuditCheck = z.infer<typeof auditCheckSchema>;

export const checkAudit = defineRoute({
  name: 'checkAudit',
  summary: 'Follow the audit chain from its first entry: how far it is right, who stands in it and what they did',
  method: 'GET',
  path: '/labs/:labId/audit-check',
  access: 'members.manage',
  status: 200,
  response: auditCheckSchema,
  problems: ['not-found'],
});
