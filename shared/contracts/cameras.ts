import * as z from 'zod';
import { pictureTypes } from '../camera/picture';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** Cameras that look at a rig, and the frames that runs keep of them. */

/**
 * `drawn`: the simulated rig as it truly stands; `address`: a camera of the network that gives a picture or an MJPEG stream; `pushed`: a
 * browser or a program sends its pictures with a token.
 */
export const cameraKinds = ['drawn', 'address', 'pushed'] as const;
export type CameraKind = (typeof cameraKinds)[number];

export const frameMoments = ['mark', 'swing-began', 'swing-ended'] as const;
export type FrameMoment = (typeof frameMoments)[number];

export const cameraStatusSchema = z.strictObject({
  /** When a picture was asked for last. */
  askedAt: instantSchema,
  /** Why it did not come; null when it did. */
  reason: z.string().nullable(),
});
export type CameraStatus = z.infer<typeof cameraStatusSchema>;

export const cameraViewSchema = z.strictObject({
  id: idSchema,
  name: z.string(),
  kind: z.enum(cameraKinds),
  address: z.string().nullable(),
  /** Whether it is given a name and a password; neither is ever told. */
  signsIn: z.boolean(),
  madeAt: instantSchema,
  madeBy: z.string(),
  /** When the newest picture was taken; null before the first. */
  takenAt: instantSchema.nullable(),
  /** Null before it was asked. */
  status: cameraStatusSchema.nullable(),
});
export type CameraView = z.infer<typeof cameraViewSchema>;

const path = '/labs/:labId/rigs/:rigId/cameras';
const nameSchema = z.string().trim().min(1, 'a name of at least one character').max(60);

export const listCameras = defineRoute({
  name: 'listCameras',
  summary: 'Cameras of a rig, with what became of the last picture; as long as somebody looks, cameras are asked for new ones',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  query: z.strictObject({ look: z.enum(['true']).optional() }),
  response: z.strictObject({
    items: z.array(cameraViewSchema),
    /** Hosts that cameras may be at, as the server is set up. */
    hosts: z.array(z.string()),
    /** Whether the rig is part of the server, so that it can be drawn. */
    simulated: z.boolean(),
  }),
  problems: ['invalid-input', 'not-found'],
});
export const addCamera = defineRoute({
  name: 'addCamera',
  summary: 'Add a camera; one with an address is asked for a picture first',
  method: 'POST',
  path,
  access: 'tokens.manage',
  status: 201,
  body: z.discriminatedUnion('kind', [
    z.strictObject({ kind: z.literal('drawn'), name: nameSchema }),
    z.strictObject({ kind: z.literal('pushed'), name: nameSchema }),
    z.strictObject({
      kind: z.literal('address'),
      name: nameSchema,
      address: z
        .string()
        .trim()
        .max(500)
        .regex(/^https?:\/\/[^\s@]+$/, 'http://host:80/picture.jpg, without a name or a password in it'),
      userName: z.string().trim().min(1).max(200).nullable(),
      password: z.string().min(1).max(1000).nullable(),
    }),
  ]),
  response: z.strictObject({
    camera: cameraViewSchema,
    /** The token of one whose pictures are sent, shown once: only a hash of it is kept. Null for the others. */
    secret: z.string().nullable(),
  }),
  problems: ['invalid-input', 'not-found', 'not-possible-now', 'unreadable-data'],
});
export const sendCameraPicture = defineRoute({
  name: 'sendCameraPicture',
  summary:
    'Send a picture, JPEG or PNG, with the token of its camera; it takes the place of the one before, and frames of a run are taken from it',
  method: 'POST',
  path: '/camera-pictures',
  access: 'device',
  status: 204,
  consumes: 'image/*',
  query: z.strictObject({
    /** How long before this request the picture was taken, s, by the sender's own clock. */
    ageS: z.coerce.number().min(0).max(60).default(0),
  }),
  problems: ['wrong-token', 'invalid-input', 'unreadable-data', 'too-large', 'wrong-content-type', 'too-many-requests'],
});
export const removeCamera = defineRoute({
  name: 'removeCamera',
  summary: 'Remove a camera; its frames stay with their runs, its name, password and token are forgotten',
  method: 'DELETE',
  path: `${path}/:cameraId`,
  access: 'tokens.manage',
  status: 204,
  problems: ['not-found'],
});
export const getCameraPicture = defineRoute({
  name: 'getCameraPicture',
  summary: 'The newest picture of a camera; the header Last-Modified says when it was taken',
  method: 'GET',
  path: `${path}/:cameraId/picture`,
  access: 'read',
  status: 200,
  produces: 'image/*',
  problems: ['not-found'],
});
export const frameViewSchema = z.strictObject({
  id: idSchema,
  cameraId: idSchema,
  /** Name of the camera at that time. */
  camera: z.string(),
  /** Row of the step log. */
  seq: z.number().int(),
  moment: z.enum(frameMoments),
  /** When the moment was. */
  at: instantSchema,
  picture: z
    .strictObject({
      takenAt: instantSchema,
      /** Standard uncertainty of that instant, s. */
      uTakenS: z.number(),
      type: z.enum(pictureTypes),
      bytes: z.number().int(),
      sha256: z.string(),
    })
    .nullable(),
  /** Why there is no picture. */
  note: z.string().nullable(),
});
export type FrameView = z.infer<typeof frameViewSchema>;

export const listFrames = defineRoute({
  name: 'listFrames',
  summary: 'Camera frames of a run, by time',
  method: 'GET',
  path: '/labs/:labId/runs/:runId/frames',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(frameViewSchema) }),
  problems: ['not-found'],
});
export const getFramePicture = defineRoute({
  name: 'getFramePicture',
  summary: 'The picture of a frame, which never changes',
  method: 'GET',
  path: '/labs/:labId/runs/:runId/frames/:frameId/picture',
  access: 'read',
  status: 200,
  produces: 'image/*',
  problems: ['not-found'],
});
