import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** Who answers for a rig, who is arming it, who has signed its cautions, and whose hands are in it. */

/** Somebody on site answers for the rig until `until`. */
export const armViewSchema = z.strictObject({
  id: idSchema,
  name: z.string(),
  from: instantSchema,
  until: instantSchema,
  note: z.string(),
});
export type ArmView = z.infer<typeof armViewSchema>;

/** Somebody is arming the rig: the key is awaited, or the exit delay goes on. */
export const armingViewSchema = z.strictObject({
  /** Who will answer for the rig, and until when. */
  name: z.string(),
  until: instantSchema,
  /** `key-off`: the key is on from before and has to be turned off first; `key-on`: it has to be turned on; `leave`: the exit delay goes on. */
  stage: z.enum(['key-off', 'key-on', 'leave']),
  /** When the key is awaited no longer, or when the exit delay ends and the door must be closed. */
  endsAt: instantSchema,
});
export type ArmingView = z.infer<typeof armingViewSchema>;

/** Why the rig is not armed: the end of the arm before, or of an arming that came to nothing. */
export const disarmedViewSchema = z.strictObject({ name: z.string(), why: z.string(), at: instantSchema });
export type DisarmedView = z.infer<typeof disarmedViewSchema>;

/** Somebody's hands are in the rig: nothing moves until every lock is lifted. */
export const lockViewSchema = z.strictObject({ id: idSchema, userId: idSchema, name: z.string(), note: z.string(), since: instantSchema });
export type LockView = z.infer<typeof lockViewSchema>;

/** All that says whether and for whom the rig may be set in motion. */
export const standingSchemas = {
  arm: armViewSchema.nullable(),
  arming: armingViewSchema.nullable(),
  disarmed: disarmedViewSchema.nullable(),
  locks: z.array(lockViewSchema),
};

export const signatureViewSchema = z.strictObject({
  userId: idSchema,
  name: z.string(),
  /** Version of the words that were signed. */
  version: z.number().int(),
  at: instantSchema,
});
export type SignatureView = z.infer<typeof signatureViewSchema>;

const rigPath = '/labs/:labId/rigs/:rigId';

export const arm = defineRoute({
  name: 'arm',
  summary:
    'Begin to arm the rig: the arm key is then turned on at the rig, and after the exit delay the door must be closed; the arm lasts 72 h at most',
  method: 'POST',
  path: `${rigPath}/arm`,
  access: 'rig.arm',
  status: 202,
  idempotent: true,
  body: z.strictObject({
    /** The person on site who answers for the rig. */
    name: z.string().min(1).max(120),
    until: instantSchema,
    note: z.string().max(500).default(''),
  }),
  response: armingViewSchema,
  problems: ['invalid-input', 'not-found', 'not-ready', 'rig-busy', 'not-signed', 'locked'],
});
export const disarm = defineRoute({
  name: 'disarm',
  summary: 'End the arm, or an arming that goes on',
  method: 'DELETE',
  path: `${rigPath}/arm`,
  access: 'rig.arm',
  status: 204,
  problems: ['not-found'],
});
export const signCautions = defineRoute({
  name: 'signCautions',
  summary: 'Sign the cautions for this rig, in the version that was read',
  method: 'POST',
  path: `${rigPath}/cautions`,
  access: 'cautions.sign',
  status: 201,
  idempotent: true,
  body: z.strictObject({ version: z.number().int().positive() }),
  response: signatureViewSchema,
  problems: ['invalid-input', 'not-found', 'edited-meanwhile'],
});
export const setLock = defineRoute({
  name: 'setLock',
  summary: "Set one's own personal lock: what moves is held, the arm is void, and nothing moves until it is lifted",
  method: 'POST',
  path: `${rigPath}/locks`,
  access: 'lock.own',
  status: 201,
  idempotent: true,
  body: z.strictObject({ note: z.string().max(200).default('') }),
  response: lockViewSchema,
  problems: ['invalid-input', 'not-found'],
});
export const liftLock = defineRoute({
  name: 'liftLock',
  summary: "Lift one's own personal lock, at the rig: its arm key was turned, on or off, within the last 2 min",
  method: 'POST',
  path: `${rigPath}/locks/:lockId/lift`,
  access: 'lock.own',
  status: 204,
  idempotent: true,
  body: z.strictObject({ handsOut: z.literal(true) }),
  problems: ['invalid-input', 'not-found', 'not-allowed', 'not-ready'],
});
export const overrideLock = defineRoute({
  name: 'overrideLock',
  summary: 'Lift the personal lock of somebody else, with a reason',
  method: 'POST',
  path: `${rigPath}/locks/:lockId/override`,
  access: 'lock.override',
  status: 204,
  idempotent: true,
  body: z.strictObject({ reason: z.string().trim().min(3).max(500) }),
  problems: ['invalid-input', 'not-found'],
});
export const turnVirtual = defineRoute({
  name: 'turnVirtual',
  summary: 'Turn the virtual arm key, or open or close the virtual door, of a rig that is part of this server; a real rig has neither',
  method: 'POST',
  path: `${rigPath}/virtual`,
  access: 'rig.arm',
  status: 204,
  body: z.union([z.strictObject({ armKey: z.enum(['on', 'off']) }), z.strictObject({ door: z.enum(['open', 'closed']) })]),
  problems: ['invalid-input', 'not-found', 'not-possible-now'],
});
