import type { Response } from 'express';
import type * as z from 'zod';
import * as contracts from '@/shared/contracts/cameras';
import type { CameraView, FrameView } from '@/shared/contracts/cameras';
import { MOST_PICTURE_BYTES, pictureTypeOf } from '@/shared/camera/picture';
import { refusalOf } from '@/server/ingest/camera-fetch';
import { NoPicture } from '@/server/interfaces/camera';
import * as store from '@/server/store/cameras';
import { findRig } from '@/server/store/rigs';
import { audited } from '../audited';
import { bearerOf, boundedBody } from '../device-request';
import { sealedPassword } from '../kept-password';
import { isoOf, isoOrNull } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import { loadRun } from '../run-view';
import type { Services } from '../services';

/** Of one rig. */
const MOST_CAMERAS = 4;

const viewOf = (camera: store.CameraRecord & { takenAt: number | null }): CameraView => ({
  id: camera.id,
  name: camera.name,
  kind: camera.kind,
  address: camera.address,
  signsIn: camera.userName !== null,
  madeAt: isoOf(camera.madeAt),
  madeBy: camera.madeBy,
  takenAt: isoOrNull(camera.takenAt),
  status: camera.status,
});

function frameViewOf({
  id,
  cameraId,
  cameraName,
  seq,
  moment,
  at,
  takenAt,
  uTakenS,
  type,
  sha256,
  size,
  note,
}: store.FrameFacts): FrameView {
  const whole = takenAt !== null && uTakenS !== null && type !== null && sha256 !== null;
  const picture = whole ? { takenAt: isoOf(takenAt), uTakenS, type, sha256, bytes: size } : null;
  return { id, cameraId, camera: cameraName, seq, moment, at: isoOf(at), picture, note };
}

async function loadRig(services: Services, labId: string, rigId: string) {
  const rig = await findRig(services.database.db, labId, rigId);
  if (rig === null) throw notFound('rig');
  return rig;
}

const isSimulated = ({ link }: Awaited<ReturnType<typeof loadRig>>) => link.kind === 'board' || link.kind === 'simulated';

type NewCamera = z.output<typeof contracts.addCamera.body>;

/** @throws ProblemError where no picture comes, saying why */
async function assertGives(services: Services, body: NewCamera, simulated: boolean): Promise<void> {
  if (body.kind === 'pushed') return;
  if (body.kind === 'drawn') {
    if (simulated) return;
    throw new ProblemError('not-possible-now', 'This rig is not part of the server, so it cannot be drawn. Give the address of a camera.');
  }
  const refusal = refusalOf(body.address, services.config.cameraHosts);
  if (refusal !== null)
    throw new ProblemError('invalid-input', `The camera was not added: ${refusal}.`, [{ path: 'address', message: refusal }]);
  try {
    await services.cameras.take(body);
  } catch (error) {
    if (!(error instanceof NoPicture)) throw error;
    throw new ProblemError('unreadable-data', `The camera was not added: ${error.message}.`, [{ path: 'address', message: error.message }]);
  }
}

function answerWith(res: Response, { type, bytes, takenAt }: { type: string; bytes: Buffer; takenAt: number }): void {
  res.set('Last-Modified', new Date(takenAt).toUTCString());
  res.type(type).send(bytes);
}

const rigRoutes = [
  mount(contracts.listCameras, async ({ params, query, membership, services }) => {
    const rig = await loadRig(services, membership.labId, params.rigId);
    const ofRig = { labId: membership.labId, rigId: rig.id };
    const { db } = services.database;
    if (query.look === 'true') await store.noteLook(db, ofRig, services.clock.utcMs());
    const items = await store.camerasOf(db, ofRig);
    return { items: items.map(viewOf), hosts: [...services.config.cameraHosts], simulated: isSimulated(rig) };
  }),

  mount(contracts.addCamera, async (context) => {
    const { params, membership, services, body, me } = context;
    const rig = await loadRig(services, membership.labId, params.rigId);
    const ofRig = { labId: membership.labId, rigId: rig.id };
    await assertGives(services, body, isSimulated(rig));
    const secret = body.kind === 'pushed' ? services.newToken() : null;
    const data = ({ id, name, kind, address }: store.CameraRecord) => ({ rigId: rig.id, cameraId: id, name, kind, address });
    const made = await audited(context, { kind: 'camera.added', data }, async (tx) => {
      if ((await store.camerasOf(tx, ofRig)).length >= MOST_CAMERAS)
        throw new ProblemError('not-possible-now', `A rig has ${String(MOST_CAMERAS)} cameras at most. Remove one first.`);
      const { name, kind } = body;
      const { address, userName, password } = body.kind === 'address' ? body : { address: null, userName: null, password: null };
      const tokenHash = secret === null ? null : services.sha256(secret);
      const place = { address, userName, password: sealedPassword(services, { of: 'camera', ...ofRig }, password), tokenHash };
      return store.insertCamera(tx, { ...ofRig, name, kind, ...place, madeAt: services.clock.utcMs(), madeBy: me.name });
    });
    return { camera: viewOf({ ...made, takenAt: null }), secret };
  }),

  mount(contracts.removeCamera, async (context) => {
    const { params, membership, services, me } = context;
    const rig = await loadRig(services, membership.labId, params.rigId);
    const data = ({ id, name }: store.CameraRecord) => ({ rigId: rig.id, cameraId: id, name });
    await audited(context, { kind: 'camera.removed', data }, async (tx) => {
      const which = { labId: membership.labId, rigId: rig.id, id: params.cameraId };
      const removed = await store.removeCamera(tx, { ...which, at: services.clock.utcMs(), by: me.name });
      if (removed === null) throw notFound('camera');
      return removed;
    });
    return undefined;
  }),

  mount(contracts.getCameraPicture, async ({ params, membership, services, res }) => {
    const which = { labId: membership.labId, rigId: params.rigId, id: params.cameraId };
    const picture = await store.pictureOf(services.database.db, which);
    if (picture === null) throw notFound('picture of this camera yet');
    res.set('Cache-Control', 'no-store');
    answerWith(res, picture);
    return undefined;
  }),
];

const runRoutes = [
  mount(contracts.listFrames, async ({ params, membership, services }) => {
    const run = await loadRun(services, membership.labId, params.runId);
    return { items: (await store.framesOf(services.database.db, { labId: run.labId, runId: run.id })).map(frameViewOf) };
  }),

  mount(contracts.getFramePicture, async ({ params, membership, services, res }) => {
    const which = { labId: membership.labId, runId: params.runId, id: params.frameId };
    const frame = await store.findFrame(services.database.db, which);
    if (frame === null || frame.bytes === null || frame.type === null || frame.takenAt === null) throw notFound('picture of this frame');
    res.set('Cache-Control', 'private, max-age=31536000, immutable');
    answerWith(res, { type: frame.type, bytes: frame.bytes, takenAt: frame.takenAt });
    return undefined;
  }),
];

const tooLarge = () =>
  new ProblemError('too-large', 'A picture has at most 1 MiB. Send a smaller one, or one that is compressed more; the one before stays.');

/** Between taking and the request: rectangular (JCGM 100:2008, 4.3.7) over the way through a network, *common practice, no source*, s. */
const WAY_S = 0.5;

const wayIn = mount(contracts.sendCameraPicture, async ({ req, query, services }) => {
  const { database, clock, sha256, appendRates, config } = services;
  const cameUtcMs = clock.utcMs();
  const camera = await store.cameraByHash(database.db, sha256(bearerOf(req)));
  if (camera === null)
    throw new ProblemError(
      'wrong-token',
      'No camera has this token, or it was removed. Add it on the page of the rig, which shows its token once.',
    );
  const share = appendRates.take(camera.id, 1);
  if (!share.ok)
    throw new ProblemError(
      'too-many-requests',
      `A camera may send ${String(config.devices.batchesPerMinute)} pictures a minute. Send the next one in ${String(Math.ceil(share.retryAfterS))} s.`,
    ).after(share.retryAfterS);
  const bytes = await boundedBody(req, MOST_PICTURE_BYTES, tooLarge);
  const type = pictureTypeOf(bytes);
  if (type === null) throw new ProblemError('unreadable-data', 'What came is no whole JPEG or PNG. The picture before stays.');
  const takenUtcMs = cameUtcMs - 1000 * (query.ageS + WAY_S / 2);
  await store.putPicture(database.db, camera, { bytes, type, takenUtcMs, uTakenS: WAY_S / Math.sqrt(12) });
  return undefined;
});

export const cameraRoutes = [...rigRoutes, ...runRoutes, wayIn];
