import * as z from 'zod';
import { callSettingsSchema, ownCallSchema } from '../alarms/settings';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** Who is on call, how each is reached, and the outside watcher that would notice a dead server. */

const path = '/labs/:labId/on-call';

export const callMemberSchema = z.strictObject({
  userId: idSchema,
  name: z.string(),
  role: z.string(),
  doNotRing: ownCallSchema.shape.doNotRing,
  /** Browsers that take push messages for this person. */
  devices: z.number().int(),
});
export type CallMember = z.infer<typeof callMemberSchema>;

export const onCallSchema = z.strictObject({
  settings: callSettingsSchema,
  members: z.array(callMemberSchema),
  /** Names in the order in which they would be rung now for a run that you start. */
  order: z.array(z.strictObject({ userId: idSchema, name: z.string() })),
  own: ownCallSchema,
});
export type OnCall = z.infer<typeof onCallSchema>;

export const getOnCall = defineRoute({
  name: 'getOnCall',
  summary: 'Who is on call, in which order and after how long, and who is not to be rung when',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  response: onCallSchema,
  problems: ['not-found'],
});
export const changeOnCall = defineRoute({
  name: 'changeOnCall',
  summary: 'Set who is rung, in which order and after how long',
  method: 'PUT',
  path,
  access: 'lab.settings',
  status: 200,
  body: callSettingsSchema,
  response: onCallSchema,
  problems: ['invalid-input', 'not-found'],
});
export const changeOwnCall = defineRoute({
  name: 'changeOwnCall',
  summary: 'Set the hours in which you are not to be rung in this lab',
  method: 'PUT',
  path: `${path}/own`,
  access: 'read',
  status: 200,
  body: ownCallSchema,
  response: ownCallSchema,
  problems: ['invalid-input', 'not-found'],
});
export const tryCall = defineRoute({
  name: 'tryCall',
  summary: 'Send a trial message to yourself, by push and by mail, and say what became of it',
  method: 'POST',
  path: `${path}/trial`,
  access: 'read',
  status: 200,
  response: z.strictObject({
    items: z.array(
      z.strictObject({ means: z.enum(['push', 'mail', 'none']), outcome: z.enum(['sent', 'failed', 'not-set-up']), detail: z.string() }),
    ),
  }),
  problems: ['not-found', 'too-many-requests'],
});

const watcher = '/labs/:labId/watcher';
export const watcherSchema = z.strictObject({
  /** Null: no sign of life is sent. */
  url: z.string().nullable(),
  lastAt: instantSchema.nullable(),
  ok: z.boolean().nullable(),
  detail: z.string(),
});
export type WatcherView = z.infer<typeof watcherSchema>;

export const getWatcher = defineRoute({
  name: 'getWatcher',
  summary: 'The address that gets a sign of life each minute, and what it answered last',
  method: 'GET',
  path: watcher,
  access: 'lab.settings',
  status: 200,
  response: watcherSchema,
  problems: ['not-found'],
});
export const changeWatcher = defineRoute({
  name: 'changeWatcher',
  summary: 'Set or remove the address that gets a sign of life each minute; one is sent at once',
  method: 'PUT',
  path: watcher,
  access: 'lab.settings',
  status: 200,
  body: z.strictObject({ url: z.string().trim().max(500).nullable() }),
  response: watcherSchema,
  problems: ['invalid-input', 'not-found'],
});

/** Base64url without padding. */
const base64url = z.string().regex(/^[A-Za-z0-9_-]+$/);

export const getPushKey = defineRoute({
  name: 'getPushKey',
  summary: 'The public key with which this server signs push messages (VAPID, RFC 8292), base64url',
  method: 'GET',
  path: '/push/key',
  access: 'signed-in',
  status: 200,
  response: z.strictObject({ publicKey: z.string() }),
  problems: [],
});
export const pushDeviceSchema = z.strictObject({
  id: idSchema,
  device: z.string(),
  madeAt: instantSchema,
  lastSentAt: instantSchema.nullable(),
});
export type PushDevice = z.infer<typeof pushDeviceSchema>;
export const listPushDevices = defineRoute({
  name: 'listPushDevices',
  summary: 'Your browsers that take push messages',
  method: 'GET',
  path: '/push/subscriptions',
  access: 'signed-in',
  status: 200,
  response: z.strictObject({ items: z.array(pushDeviceSchema) }),
  problems: [],
});
export const addPushDevice = defineRoute({
  name: 'addPushDevice',
  summary: 'Let a browser take push messages for you; the same one again is the same device',
  method: 'POST',
  path: '/push/subscriptions',
  access: 'signed-in',
  status: 201,
  body: z.strictObject({
    endpoint: z.string().max(1000),
    keys: z.strictObject({ p256dh: base64url.min(80).max(100), auth: base64url.min(16).max(40) }),
    device: z.string().trim().min(1).max(120),
  }),
  response: pushDeviceSchema,
  problems: ['invalid-input'],
});
export const removePushDevice = defineRoute({
  name: 'removePushDevice',
  summary: 'Send no more push messages to a browser of yours',
  method: 'DELETE',
  path: '/push/subscriptions/:deviceId',
  access: 'signed-in',
  status: 204,
  problems: ['not-found'],
});
