import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { channelViewSchema } from './data';
import { defineRoute } from './route';

/** Devices that send samples as they measure: their tokens, the channels they fill, and the way in. */

const nameSchema = z.string().trim().min(1, 'a name of at least one character').max(80);

/** A channel that a device fills. A deflection is an angle or a spot on the scale; anything else has a unit of the lab's choice. */
export const streamChannelSchema = z
  .strictObject({
    name: nameSchema,
    role: z.enum(['deflection', 'environment']),
    unit: z.string().trim().min(1).max(20),
    /** Samples a second that are to be expected. */
    rateHz: z.number().positive().max(1000),
  })
  .refine(({ role, unit }) => role !== 'deflection' || ['rad', 'mrad', 'urad', 'm', 'mm'].includes(unit), {
    path: ['unit'],
    message: 'a deflection is in rad, mrad, urad, m or mm',
  });
export type StreamChannel = z.infer<typeof streamChannelSchema>;

export const deviceTokenViewSchema = z.strictObject({
  id: idSchema,
  name: z.string(),
  channels: z.array(z.string()),
  madeAt: instantSchema,
  madeBy: z.string(),
  lastUsedAt: instantSchema.nullable(),
  /** Null while it counts. */
  revokedAt: instantSchema.nullable(),
});
export type DeviceTokenView = z.infer<typeof deviceTokenViewSchema>;

const path = '/labs/:labId/rigs/:rigId/devices';

export const listDevices = defineRoute({
  name: 'listDevices',
  summary: 'Device tokens of a rig, newest first, and the channels that devices fill',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  response: z.strictObject({
    tokens: z.array(deviceTokenViewSchema),
    channels: z.array(
      z.strictObject({
        channel: channelViewSchema,
        lastSampleAt: instantSchema.nullable(),
        /** Before, summaries alone are left, except within runs; null where nothing was thinned. */
        thinnedToAt: instantSchema.nullable(),
      }),
    ),
  }),
  problems: ['not-found'],
});
export const makeDeviceToken = defineRoute({
  name: 'makeDeviceToken',
  summary: 'Make a token with which a device can append samples to the channels named, which are made where they are missing',
  method: 'POST',
  path,
  access: 'tokens.manage',
  status: 201,
  body: z.strictObject({ name: nameSchema, channels: z.array(streamChannelSchema).min(1).max(8) }),
  response: z.strictObject({
    token: deviceTokenViewSchema,
    /** Shown once: only a hash of it is kept. */
    secret: z.string(),
  }),
  problems: ['invalid-input', 'not-found', 'already-exists'],
});
export const revokeDeviceToken = defineRoute({
  name: 'revokeDeviceToken',
  summary: 'Revoke a device token: nothing is taken from the device any more; what it sent stays',
  method: 'DELETE',
  path: `${path}/:tokenId`,
  access: 'tokens.manage',
  status: 204,
  problems: ['not-found'],
});
export const appendSamples = defineRoute({
  name: 'appendSamples',
  summary:
    'Append samples, one JSON object a line: {"channel", "time_utc", "value"}; all lines or none, and what is sent again is stored once',
  method: 'POST',
  path: '/samples',
  access: 'device',
  status: 200,
  consumes: 'application/x-ndjson',
  response: z.strictObject({
    /** Samples that were new, and those that were known already. */
    stored: z.number().int(),
    known: z.number().int(),
  }),
  problems: ['wrong-token', 'unreadable-data', 'too-large', 'wrong-content-type', 'too-many-requests'],
});
