import * as z from 'zod';

/** RFC 9457 problem details with stable codes: programs branch on `code`, people read `detail`. */
export const problemCodes = {
  'invalid-input': 400,
  'not-signed-in': 401,
  'wrong-credentials': 401,
  'wrong-token': 401,
  'session-expired': 401,
  'not-allowed': 403,
  'cross-site': 403,
  'not-found': 404,
  'rig-busy': 409,
  'not-armed': 409,
  'not-signed': 409,
  'not-reviewed': 409,
  locked: 409,
  'not-ready': 409,
  'not-possible-now': 409,
  'already-exists': 409,
  'still-running': 409,
  'edited-meanwhile': 412,
  'too-large': 413,
  'wrong-content-type': 415,
  'protocol-refused': 422,
  'not-yet': 422,
  'key-reused': 422,
  'unreadable-data': 422,
  'cannot-evaluate': 422,
  'precondition-required': 428,
  'too-many-requests': 429,
  internal: 500,
  'database-away': 503,
  'files-away': 503,
  'rigs-away': 503,
  'no-room': 507,
} as const;

export type ProblemCode = keyof typeof problemCodes;

export const problemSchema = z.strictObject({
  /** `/problems/<code>` */
  type: z.string(),
  title: z.string(),
  status: z.number().int(),
  code: z.enum(Object.keys(problemCodes) as [ProblemCode, ...ProblemCode[]]),
  /** What is wrong, where, and what would be right: one or two sentences for people. */
  detail: z.string(),
  instance: z.string().optional(),
  /** One entry for each thing that is wrong: where it is and what would be accepted. */
  errors: z.array(z.strictObject({ path: z.string(), message: z.string(), code: z.string().optional() })).optional(),
});

export type Problem = z.infer<typeof problemSchema>;
