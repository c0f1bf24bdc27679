import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';
import { linkSettingsSchema, usbIdentitySchema } from './rigs';
import { armingViewSchema, armViewSchema, disarmedViewSchema, lockViewSchema } from './standing';

/** The line of a rig as it is now, and the small moves of a person who stands at the rig. */

/** Limits, caps and home speed in the rig's units. */
export const motionLimitsSchema = z.strictObject({
  minDeg: z.number(),
  maxDeg: z.number(),
  maxSpeed_deg_s: z.number(),
  maxAcceleration_deg_s2: z.number(),
  homeSpeed_deg_s: z.number(),
});

export const linkHealthSchema = z.strictObject({
  condition: z.enum(['closed', 'opening', 'ready', 'lost', 'refused']),
  /** In words: what is awaited, or why the controller is refused. */
  detail: z.string(),
  lastReplyAt: instantSchema.nullable(),
  roundTripMs: z.number().nullable(),
  /** Of the last 100 answers. */
  roundTripP50Ms: z.number().nullable(),
  roundTripP95Ms: z.number().nullable(),
  /** What came in and was no message. */
  discardedLines: z.number().int(),
  discardedBytes: z.number().int(),
  /** Lines that the controller dropped since it started; null before it told. */
  droppedByController: z.number().int().nullable(),
  retries: z.number().int(),
  reconnects: z.number().int(),
  /** Controller's clock minus the server's, with its standard uncertainty; null before the first exchange. */
  clock: z.strictObject({ offsetMs: z.number(), uMs: z.number() }).nullable(),
  /** How much faster the controller's clock runs, with its standard uncertainty; null before there is a line to fit. */
  drift: z.strictObject({ ppm: z.number(), uPpm: z.number() }).nullable(),
  /** Version of the line protocol that the controller speaks. */
  protocol: z.string().nullable(),
  /** Number under which another server has driven the controller, which keeps this one out; null: none does. */
  keptOutBy: z.number().int().nullable(),
});
export type LinkHealthView = z.infer<typeof linkHealthSchema>;

export const controllerViewSchema = z.strictObject({
  bootId: z.string(),
  firmware: z.string(),
  positionKnown: z.boolean(),
  angleDeg: z.number().nullable(),
  moving: z.boolean(),
  interlockClosed: z.boolean(),
  supplyPresent: z.boolean(),
  armKey: z.boolean(),
  driversOn: z.boolean(),
  homeFlagCovered: z.boolean(),
  leaseLive: z.boolean(),
  warningDue: z.boolean(),
});
export type ControllerView = z.infer<typeof controllerViewSchema>;

const edgePassSchema = z.strictObject({ steps: z.number().int(), direction: z.enum(['ccw', 'cw']) });

export const guidedViewSchema = z.strictObject({
  id: idSchema,
  by: z.strictObject({ id: idSchema, name: z.string() }),
  since: instantSchema,
  /** Whether the page of that person has answered within the last 2 s. */
  present: z.boolean(),
  /** Why nothing may be ordered now; empty while something may. */
  whyNot: z.string(),
  order: z
    .strictObject({
      id: z.string(),
      at: instantSchema,
      kind: z.enum(['nudge', 'home']),
      steps: z.number().int().nullable(),
      state: z.enum(['sent', 'accepted', 'moving', 'done', 'cut short', 'refused']),
      detail: z.string(),
    })
    .nullable(),
  /** Microsteps turned since the count began; it begins anew, under the next number, when nobody knows how far a move went. */
  count: z.strictObject({ number: z.number().int(), steps: z.number().int() }),
  /** Passes of the home flag's edge, microsteps from home, the newest last. */
  edges: z.array(edgePassSchema),
  longestNudgeSteps: z.number().int(),
});
export type GuidedView = z.infer<typeof guidedViewSchema>;

export const haltViewSchema = z.strictObject({
  kind: z.enum(['hold', 'stop']),
  by: z.string(),
  serverAt: instantSchema,
  /** When the controller itself said that the turntable stands still; null until then. */
  confirmedAt: instantSchema.nullable(),
});

/** The one message of the live stream of a line (server-sent event `line`): twice a second, and at once when something happens. */
export const lineMessageSchema = z.strictObject({
  serverAt: instantSchema,
  /** Given back by the page of a guided first move, to show that it still sees the rig. */
  beat: z.number(),
  link: linkSettingsSchema,
  health: linkHealthSchema,
  controller: controllerViewSchema.nullable(),
  /** As the controller itself keeps them; null before it has told. */
  limits: motionLimitsSchema.nullable(),
  arm: armViewSchema.nullable(),
  arming: armingViewSchema.nullable(),
  disarmed: disarmedViewSchema.nullable(),
  locks: z.array(lockViewSchema),
  /** The run that has the rig, in a sentence; null while it is free. */
  takenBy: z.string().nullable(),
  guided: guidedViewSchema.nullable(),
  halt: haltViewSchema.nullable(),
});
export type LineMessage = z.infer<typeof lineMessageSchema>;

const rigPath = '/labs/:labId/rigs/:rigId';
const guidedPath = `${rigPath}/guided`;
/** Whoever orders looks at the gap and means to enter an arc that is kept out of runs. */
const intoKeepOut = z.boolean().default(false);
/** When the tap was made, by the page's clock corrected to the server's: a tap that moves something counts for 5 s. */
const tappedAt = instantSchema;
const orderProblems = [
  'invalid-input',
  'not-found',
  'rig-busy',
  'not-armed',
  'not-ready',
  'not-signed',
  'locked',
  'not-possible-now',
  'key-reused',
  'still-running',
] as const;

export const liveLine = defineRoute({
  name: 'liveLine',
  summary: 'Live stream of the line to a controller: health, inputs, guided moves',
  method: 'GET',
  path: `${rigPath}/line/live`,
  access: 'read',
  status: 200,
  produces: 'text/event-stream',
  problems: ['not-found', 'too-many-requests'],
});
export const serialPortSchema = z.strictObject({
  path: z.string(),
  /** The same port under a name that does not change when plugs are changed; null where there is none. */
  stablePath: z.string().nullable(),
  label: z.string().nullable(),
  usb: usbIdentitySchema.nullable(),
  /** Name of the rig whose line goes over this port; null while none does. */
  usedBy: z.string().nullable(),
});
export type SerialPortView = z.infer<typeof serialPortSchema>;
export const listSerialPorts = defineRoute({
  name: 'listSerialPorts',
  summary: 'Serial ports of the server, to choose from',
  method: 'GET',
  path: '/labs/:labId/serial-ports',
  access: 'rig.edit',
  status: 200,
  response: z.strictObject({ items: z.array(serialPortSchema) }),
  problems: ['not-found'],
});
export const takeController = defineRoute({
  name: 'takeController',
  summary: 'Take a controller over that obeys another server: for good, and only where that one is gone',
  method: 'POST',
  path: `${rigPath}/line/take-over`,
  access: 'rig.edit',
  status: 202,
  idempotent: true,
  /** The other server's number as the page shows it. */
  body: z.strictObject({ keptOutBy: z.number().int() }),
  response: z.strictObject({ number: z.number().int() }),
  problems: ['invalid-input', 'not-found', 'not-possible-now', 'key-reused', 'still-running'],
});
export const beginGuided = defineRoute({
  name: 'beginGuided',
  summary: 'Begin a guided first move: the rig is held for small moves by a person who stands at it',
  method: 'POST',
  path: guidedPath,
  access: 'run.start',
  status: 201,
  idempotent: true,
  /** Whoever begins stands at the rig and sees the table. */
  body: z.strictObject({ atTheRig: z.literal(true) }),
  response: guidedViewSchema,
  problems: orderProblems,
});
export const endGuided = defineRoute({
  name: 'endGuided',
  summary: 'End a guided first move; what moves is held',
  method: 'POST',
  path: `${guidedPath}/end`,
  access: 'run.start',
  status: 204,
  body: z.strictObject({ guidedId: idSchema }),
  problems: ['invalid-input', 'not-found'],
});
export const stayGuided = defineRoute({
  name: 'stayGuided',
  summary: 'The page of a guided first move has a beat of the live stream; without this for 2 s motion is held',
  method: 'POST',
  path: `${guidedPath}/stay`,
  access: 'run.start',
  status: 204,
  body: z.strictObject({ guidedId: idSchema, beat: z.number() }),
  problems: ['invalid-input', 'not-found', 'rig-busy', 'not-possible-now'],
});
export const nudge = defineRoute({
  name: 'nudge',
  summary: 'Turn the table a little from where it stands; positive is counter-clockwise seen from above',
  method: 'POST',
  path: `${guidedPath}/nudge`,
  access: 'run.start',
  status: 202,
  idempotent: true,
  body: z.strictObject({
    guidedId: idSchema,
    /** Microsteps. */
    steps: z.number().int().min(-1_000_000).max(1_000_000),
    intoKeepOut,
    tappedAt,
  }),
  response: guidedViewSchema,
  problems: orderProblems,
});
export const homeByHand = defineRoute({
  name: 'homeByHand',
  summary: 'Find the home edge while a person stands at the rig',
  method: 'POST',
  path: `${guidedPath}/home`,
  access: 'run.start',
  status: 202,
  idempotent: true,
  body: z.strictObject({ guidedId: idSchema, intoKeepOut, tappedAt }),
  response: guidedViewSchema,
  problems: orderProblems,
});
export const teachLimits = defineRoute({
  name: 'teachLimits',
  summary: 'Write the limits of the rig document to the controller, for good',
  method: 'POST',
  path: `${guidedPath}/teach`,
  access: 'rig.edit',
  status: 200,
  idempotent: true,
  etag: 'required',
  body: z.strictObject({ guidedId: idSchema, tappedAt }),
  response: z.strictObject({ limits: motionLimitsSchema }),
  problems: [...orderProblems, 'edited-meanwhile', 'precondition-required'],
});
const halt = <L extends 'hold' | 'stop'>(leaf: L, route: { name: string; summary: string; access: 'run.hold' | 'run.stop' }) =>
  defineRoute({
    ...route,
    method: 'POST',
    path: `${rigPath}/${leaf}` as const,
    status: 202,
    idempotent: true,
    body: z.strictObject({ tappedAt: tappedAt.optional() }),
    response: z.strictObject({ rigId: idSchema, serverAt: instantSchema }),
    problems: ['invalid-input', 'not-found', 'not-possible-now', 'key-reused', 'still-running'],
  });
export const holdRig = halt('hold', {
  name: 'holdRig',
  summary: 'Hold whatever moves on the rig: decelerate, keep torque',
  access: 'run.hold',
});
export const stopRig = halt('stop', {
  name: 'stopRig',
  summary: 'Stop whatever moves on the rig: decelerate, end its run, void the arm',
  access: 'run.stop',
});
