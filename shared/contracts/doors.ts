import * as z from 'zod';
import { instantSchema } from './common';
import { defineRoute } from './route';

/** The card at the door of a rig's room: whether to keep out, until when, whom to ring. It has no controls. */

export const doorCardSchema = z.strictObject({
  labName: z.string(),
  rigName: z.string(),
  timeZone: z.string(),
  /** `run`: a run is on. `armed`: it may begin to move from afar. `hands`: somebody has locked it and works there. `free`: none of these. */
  state: z.enum(['run', 'armed', 'hands', 'free']),
  /** Predicted end of the run, or end of the arm; null where neither is known. */
  untilAt: instantSchema.nullable(),
  /** The next scheduled start, within a week. */
  nextAt: instantSchema.nullable(),
  /** Whom to ring, as the lab wrote it. */
  ring: z.string(),
  /** Who is on call, in the order in which alarms ring them; at most three. */
  onCall: z.array(z.string()),
  serverAt: instantSchema,
});
export type DoorCard = z.infer<typeof doorCardSchema>;

const path = '/labs/:labId/rigs/:rigId/door';
const doorStateSchema = z.strictObject({ ring: z.string(), madeAt: instantSchema.nullable() });

export const readDoor = defineRoute({
  name: 'readDoor',
  summary: 'Whom the door card of a rig says to ring, and whether it has a public address',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  response: doorStateSchema,
  problems: ['not-found'],
});
export const makeDoor = defineRoute({
  name: 'makeDoor',
  summary: 'Write the door card of a rig and give it a new public address; an earlier one ends',
  method: 'PUT',
  path,
  access: 'rig.edit',
  status: 200,
  body: z.strictObject({ ring: z.string().trim().min(1, 'say whom to ring and how').max(200) }),
  response: z.strictObject({
    /** Shown once: only a hash of it is kept. */
    address: z.string(),
    ring: z.string(),
    madeAt: instantSchema,
  }),
  problems: ['invalid-input', 'not-found'],
});
export const endDoor = defineRoute({
  name: 'endDoor',
  summary: 'End the public address of a door card',
  method: 'DELETE',
  path,
  access: 'rig.edit',
  status: 204,
  problems: ['not-found'],
});
export const doorCard = defineRoute({
  name: 'doorCard',
  summary: 'A door card, for whoever knows its address',
  method: 'GET',
  path: '/doors/:token',
  access: 'public',
  status: 200,
  response: doorCardSchema,
  problems: ['not-found'],
});
