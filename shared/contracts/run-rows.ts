import * as z from 'zod';
import { instantSchema } from './common';

/** Parts of a run's records as the API shows them. */

/** The three honest stages of hold and stop: sent (the phone's own), the server has it, the controller confirmed. */
export const interventionSchema = z.strictObject({
  kind: z.enum(['hold', 'hold-after-dwell', 'hold-withdrawn', 'resume', 'skip', 'stop']),
  by: z.string(),
  serverAt: instantSchema,
  /** When the controller itself said that the turntable stands still; null until then. */
  confirmedAt: instantSchema.nullable(),
});

/** That a run ends before the end of its protocol, on a whole pair. */
export const finishingSchema = z.strictObject({
  /** Who asked; empty: the night window of the room where there is an `overBy`, else the few good dwells. */
  by: z.string(),
  at: instantSchema,
  /** The run is to be over by then; null: with the pair under way. */
  overBy: instantSchema.nullable(),
  /** Who took it back; null: it is in force. */
  withdrawnBy: z.string().nullable(),
});

export const stepRowViewSchema = z.strictObject({
  seq: z.number().int(),
  path: z.string(),
  kind: z.string(),
  label: z.string(),
  station: z.string(),
  plannedStartUtcMs: z.number(),
  plannedEndUtcMs: z.number().nullable(),
  startUtcMs: z.number(),
  endUtcMs: z.number().nullable(),
  uStartS: z.number(),
  uEndS: z.number().nullable(),
  angleStartDeg: z.number().nullable(),
  angleEndDeg: z.number().nullable(),
  outcome: z.enum(['done', 'cut short', 'skipped', 'failed', 'late']).nullable(),
  angleSource: z.enum(['counted', 'edge-verified', 'encoder']),
  uAngleDeg: z.number().nullable(),
  good: z.boolean().nullable(),
});
export type StepRowView = z.infer<typeof stepRowViewSchema>;

export const chainedEventSchema = z.strictObject({
  seq: z.number().int(),
  at: z.string(),
  kind: z.string(),
  data: z.record(z.string(), z.unknown()),
  prev: z.string(),
  hash: z.string(),
});
