import * as z from 'zod';
import { rigDocumentSchema } from '../rig/document';
import { idSchema, instantSchema } from './common';
import { positionViewSchema } from './position';
import { defineRoute } from './route';

const portFields = {
  baudRate: z.number().int().min(300).max(1_000_000).default(115200),
  /** Levels of the control lines after opening; left as they are when absent. */
  dtr: z.boolean().optional(),
  rts: z.boolean().optional(),
};
/** What tells one USB device from another. */
export const usbIdentitySchema = z.strictObject({
  vendorId: z.string().min(1).max(20),
  productId: z.string().min(1).max(20),
  serialNumber: z.string().min(1).max(200),
});

export const linkSettingsSchema = z.discriminatedUnion('kind', [
  z.strictObject({ kind: z.literal('simulated') }),
  /** The controller's own firmware on a board that the server emulates. */
  z.strictObject({ kind: z.literal('board') }),
  z.strictObject({
    kind: z.literal('serial'),
    path: z.string().min(1).max(300),
    ...portFields,
    /** The device that was listed under the path when it was chosen: it is found again under another name. */
    usb: usbIdentitySchema.optional(),
  }),
  /** A network serial server. Loopback and private addresses are allowed; only the controller's protocol is spoken there. */
  z.strictObject({
    kind: z.literal('tcp'),
    /** A name or an address. */
    host: z
      .string()
      .max(253)
      .regex(/^[A-Za-z0-9:]([A-Za-z0-9:.-]*[A-Za-z0-9:])?$/, 'a host name or an address is needed, without http:// and without a port'),
    port: z.number().int().min(1).max(65535),
    /** `rfc2217` also sets the rate at the other end; `raw` needs it set there. */
    mode: z.enum(['raw', 'rfc2217']).default('raw'),
    ...portFields,
  }),
]);
export type LinkSettings = z.infer<typeof linkSettingsSchema>;

export const rigLiveSchema = z.strictObject({
  condition: z.enum(['closed', 'opening', 'ready', 'lost', 'refused']),
  /** In words: what is awaited, or why the controller is refused. */
  detail: z.string(),
  lastReplyAt: instantSchema.nullable(),
  roundTripMs: z.number().nullable(),
  discardedLines: z.number().int(),
  positionKnown: z.boolean(),
  angleDeg: z.number().nullable(),
  moving: z.boolean(),
  interlockClosed: z.boolean().nullable(),
  supplyPresent: z.boolean().nullable(),
  armKey: z.boolean().nullable(),
  driversOn: z.boolean().nullable(),
});
export type RigLive = z.infer<typeof rigLiveSchema>;

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
const standingSchemas = {
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

export const massSetViewSchema = z.strictObject({ id: idSchema, label: z.string(), sources: rigDocumentSchema.shape.sources });
export type MassSetView = z.infer<typeof massSetViewSchema>;

export const rigSummarySchema = z.strictObject({
  id: idSchema,
  name: z.string(),
  revision: z.number().int(),
  link: linkSettingsSchema,
  live: rigLiveSchema,
  ...standingSchemas,
  activeRun: z.strictObject({ id: idSchema, state: z.string(), protocolName: z.string() }).nullable(),
});
export const rigViewSchema = rigSummarySchema.extend({
  document: rigDocumentSchema,
  massSets: z.array(massSetViewSchema),
  /** Who has signed the cautions for this rig, the newest first. */
  signatures: z.array(signatureViewSchema),
  /** What the newest run that met the home edge says of the position; null before the first. */
  position: positionViewSchema.extend({ runId: idSchema }).nullable(),
});
export type RigSummary = z.infer<typeof rigSummarySchema>;
export type RigView = z.infer<typeof rigViewSchema>;

const rigPath = '/labs/:labId/rigs/:rigId';

export const listRigs = defineRoute({
  name: 'listRigs',
  summary: 'Rigs of the lab with their live state',
  method: 'GET',
  path: '/labs/:labId/rigs',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(rigSummarySchema) }),
  problems: ['not-found'],
});
export const createRig = defineRoute({
  name: 'createRig',
  summary: 'Add a rig',
  method: 'POST',
  path: '/labs/:labId/rigs',
  access: 'rig.edit',
  status: 201,
  idempotent: true,
  body: z.strictObject({ name: z.string().min(1).max(120), document: rigDocumentSchema, link: linkSettingsSchema }),
  response: rigViewSchema,
  problems: ['invalid-input'],
});
export const getRig = defineRoute({
  name: 'getRig',
  summary: 'One rig',
  method: 'GET',
  path: rigPath,
  access: 'read',
  status: 200,
  etag: 'reply',
  response: rigViewSchema,
  problems: ['not-found'],
});
export const reviseRig = defineRoute({
  name: 'reviseRig',
  summary: 'Make a new revision of the rig; earlier ones stay',
  method: 'PUT',
  path: `${rigPath}/document`,
  access: 'rig.edit',
  status: 200,
  etag: 'required',
  body: z.strictObject({ name: z.string().min(1).max(120), document: rigDocumentSchema, reason: z.string().min(1).max(500) }),
  response: rigViewSchema,
  problems: ['invalid-input', 'not-found', 'edited-meanwhile', 'precondition-required', 'rig-busy'],
});
export const rigRevisionSchema = z.strictObject({
  number: z.number().int(),
  at: instantSchema,
  by: z.string(),
  reason: z.string(),
  document: rigDocumentSchema,
});
export const listRigRevisions = defineRoute({
  name: 'listRigRevisions',
  summary: 'All revisions of the rig, newest first',
  method: 'GET',
  path: `${rigPath}/revisions`,
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(rigRevisionSchema) }),
  problems: ['not-found'],
});
export const changeLink = defineRoute({
  name: 'changeLink',
  summary: 'Choose the line to the controller',
  method: 'PUT',
  path: `${rigPath}/link`,
  access: 'rig.edit',
  status: 200,
  etag: 'required',
  body: linkSettingsSchema,
  response: rigViewSchema,
  problems: ['invalid-input', 'not-found', 'edited-meanwhile', 'precondition-required', 'rig-busy'],
});
export const tryLink = defineRoute({
  name: 'tryLink',
  summary: 'Open the line, say hello and tell what answered; nothing moves',
  method: 'POST',
  path: `${rigPath}/link/try`,
  access: 'rig.edit',
  status: 200,
  body: linkSettingsSchema,
  response: z.strictObject({ ok: z.boolean(), detail: z.string(), firmware: z.string().nullable() }),
  problems: ['invalid-input', 'not-found', 'rig-busy'],
});
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
  summary: "Lift one's own personal lock, at the rig",
  method: 'POST',
  path: `${rigPath}/locks/:lockId/lift`,
  access: 'lock.own',
  status: 204,
  idempotent: true,
  body: z.strictObject({ handsOut: z.literal(true) }),
  problems: ['invalid-input', 'not-found', 'not-allowed'],
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
export const addMassSet = defineRoute({
  name: 'addMassSet',
  summary: 'Add a mass set',
  method: 'POST',
  path: `${rigPath}/mass-sets`,
  access: 'rig.edit',
  status: 201,
  idempotent: true,
  body: z.strictObject({ label: z.string().min(1).max(120), sources: rigDocumentSchema.shape.sources }),
  response: massSetViewSchema,
  problems: ['invalid-input', 'not-found', 'already-exists'],
});
export const startCheckSchema = z.strictObject({
  code: z.string(),
  title: z.string(),
  state: z.enum(['pass', 'fail', 'note']),
  detail: z.string(),
});
export type StartCheck = z.infer<typeof startCheckSchema>;
export const startChecks = defineRoute({
  name: 'startChecks',
  summary: 'What stands between this rig and a start of this protocol revision',
  method: 'GET',
  path: `${rigPath}/start-checks`,
  access: 'read',
  status: 200,
  query: z.strictObject({ protocolId: idSchema, revision: z.coerce.number().int().positive() }),
  response: z.strictObject({
    checks: z.array(startCheckSchema),
    mayStart: z.boolean(),
    durationS: z.number(),
    finishAt: instantSchema,
    firstMove: z.string(),
  }),
  problems: ['invalid-input', 'not-found'],
});
