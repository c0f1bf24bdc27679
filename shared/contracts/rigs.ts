import * as z from 'zod';
import { rigDocumentSchema } from '../rig/document';
import { idSchema, instantSchema } from './common';
import { positionViewSchema } from './position';
import { defineRoute } from './route';
import { signatureViewSchema, standingSchemas } from './standing';

/** With the same words on the page and from the server. */
function wholeNumber(least: number, greatest: number) {
  const words = `a whole number from ${String(least)} to ${String(greatest)} is needed`;
  return z.number(words).int(words).min(least, words).max(greatest, words);
}

const portFields = {
  baudRate: wholeNumber(300, 1_000_000).default(115200),
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
    path: z.string().min(1).max(300, 'a path of at most 300 characters is needed'),
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
      .regex(
        /^(?=[^:]*$|.*:.*:)[A-Za-z0-9:]([A-Za-z0-9:.-]*[A-Za-z0-9:])?$/,
        'a host name or an address is needed, without http:// and without a port',
      ),
    port: wholeNumber(1, 65_535),
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
  /** What was measured for it just now; null: not known. */
  figures: z.array(z.strictObject({ name: z.string(), value: z.number().nullable(), unit: z.enum(['ms', 's', 'ppm', 'deg', 'GiB', '']) })),
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
