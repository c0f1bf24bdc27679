import * as z from 'zod';
import { instantSchema } from './common';

/** A condition as it was last looked at. */
const readingSchema = z.strictObject({
  name: z.string(),
  /** In `unit`; null where the samples do not tell. */
  value: z.number().nullable(),
  limit: z.number(),
  wanted: z.enum(['below', 'above']),
  unit: z.string(),
  met: z.boolean(),
});

/** A step that ends by a condition or a person. */
export const waitingSchema = z.strictObject({
  kind: z.enum(['settle', 'wait', 'prompt']),
  /** What the prompt asks for; empty otherwise. */
  text: z.string(),
  /** When it is given up; null: never. */
  givesUpAt: instantSchema.nullable(),
  otherwise: z.enum(['hold', 'continue', 'stop']),
  /** Before that no samples can tell. */
  firstLookAt: instantSchema,
  /** `silent`: samples are missing; null before the first look, and for a prompt. */
  samples: z.enum(['there', 'filling', 'silent']).nullable(),
  readings: z.array(readingSchema),
  /** Of a prompt: what stands in the way of confirming it. */
  mayConfirm: z.strictObject({ ok: z.boolean(), why: z.string() }),
});
export type WaitingView = z.infer<typeof waitingSchema>;

/** What a run has reached so far: near minus far from its good dwells. */
export const reversalSoFarSchema = z.strictObject({
  differenceRad: z.number(),
  /** Null while too few dwells show a scatter. */
  relativeU: z.number().nullable(),
  reversals: z.number().int(),
});
