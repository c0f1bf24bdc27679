import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** What the readings of a channel truly say: value = offset + slope · reading, with what is known of the two. */

export const calibrationSchema = z.strictObject({
  /** In the channel's unit. */
  offset: z.number(),
  slope: z.number(),
  /** Standard uncertainties, and the covariance of offset and slope. */
  uOffset: z.number().nonnegative('not below 0'),
  uSlope: z.number().nonnegative('not below 0'),
  covariance: z.number(),
});

export const calibrationViewSchema = z.strictObject({
  channelId: idSchema,
  channelName: z.string(),
  unit: z.string(),
  revision: z.number().int(),
  /** Runs that began before go by an earlier revision. */
  validFrom: instantSchema,
  calibration: calibrationSchema,
  note: z.string(),
  madeAt: instantSchema,
  madeBy: z.string(),
});
export type CalibrationView = z.infer<typeof calibrationViewSchema>;

const path = '/labs/:labId/rigs/:rigId/calibrations';

export const listCalibrations = defineRoute({
  name: 'listCalibrations',
  summary: 'Calibrations of the channels of a rig: all revisions, by channel, newest first',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(calibrationViewSchema) }),
  problems: ['not-found'],
});
export const addCalibration = defineRoute({
  name: 'addCalibration',
  summary:
    'Another revision of the calibration of a channel; earlier ones stay, and evaluations that were asked for before stay as they are',
  method: 'POST',
  path,
  access: 'rig.edit',
  status: 201,
  body: z.strictObject({
    channelId: idSchema,
    /** Runs that began from then on go by it; absent: from now on. */
    validFrom: instantSchema.optional(),
    calibration: calibrationSchema,
    /** Where it comes from: a certificate, marks of a scale. */
    note: z.string().trim().min(1, 'say where it comes from').max(500),
  }),
  response: calibrationViewSchema,
  problems: ['invalid-input', 'not-found'],
});
