import { randomUUID } from 'node:crypto';
import * as store from '@/server/store/cameras';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, makeRig, makeRun, runStart } from './rows';

const database = databaseOfThisFile();
const db = () => database().connection.db;

async function place() {
  const { id: labId } = await makeLab(db());
  const rigId = await makeRig(db(), labId);
  return { labId, rigId };
}
const cameraOf = (ofRig: { labId: string; rigId: string }, change: object = {}) =>
  store.insertCamera(db(), {
    ...{ ...ofRig, name: 'Above', kind: 'address', address: 'http://camera.lab:80/x', userName: 'lamp', password: 'word' },
    ...{ tokenHash: null, madeAt: eveningUtcMs, madeBy: 'Ilse Marrow' },
    ...change,
  });
const picture = (change: object = {}) => ({
  ...{ bytes: Buffer.of(1, 2, 3), type: 'image/png' as const, takenUtcMs: eveningUtcMs, uTakenS: 0.1 },
  ...change,
});

test('the newest picture takes the place of the one before, and goes with its camera, with name, password and token', async () => {
  const ofRig = await place();
  const tokenHash = randomUUID();
  const camera = await cameraOf(ofRig, { tokenHash });
  await store.putPicture(db(), camera, picture());
  await store.putPicture(db(), camera, picture({ bytes: Buffer.of(9), takenUtcMs: eveningUtcMs + 2_000 }));
  expect(await store.pictureOf(db(), camera)).toMatchObject({ bytes: Buffer.of(9), takenAt: eveningUtcMs + 2_000 });
  expect(await store.camerasOf(db(), ofRig)).toMatchObject([{ id: camera.id, takenAt: eveningUtcMs + 2_000 }]);
  expect((await store.cameraByHash(db(), tokenHash))?.id).toBe(camera.id);
  expect(await store.removeCamera(db(), { ...ofRig, id: camera.id, at: eveningUtcMs, by: 'Ilse Marrow' })).toMatchObject({
    ...{ userName: null, password: null, tokenHash: null, removedBy: 'Ilse Marrow' },
  });
  expect(await store.pictureOf(db(), camera)).toBeNull();
  expect(await store.cameraByHash(db(), tokenHash)).toBeNull();
  expect(await store.removeCamera(db(), { ...ofRig, id: camera.id, at: eveningUtcMs, by: 'again' })).toBeNull();
});

test('nothing of another lab is found', async () => {
  const [own, foreign] = [await place(), await place()];
  const camera = await cameraOf(own);
  await store.putPicture(db(), camera, picture());
  expect(await store.camerasOf(db(), foreign)).toEqual([]);
  expect(await store.pictureOf(db(), { ...foreign, id: camera.id })).toBeNull();
  expect(await store.removeCamera(db(), { ...foreign, id: camera.id, at: eveningUtcMs, by: 'x' })).toBeNull();
});

test('a frame is kept once for each camera and moment of a row, and never changed', async () => {
  const ofRig = await place();
  const camera = await cameraOf(ofRig);
  const start = runStart(ofRig.labId, ofRig.rigId);
  await makeRun(db(), start);
  const { runId } = start;
  const frame = (change: object = {}) => ({
    ...{ labId: ofRig.labId, runId, cameraId: camera.id, cameraName: camera.name, seq: 2, moment: 'swing-began' as const },
    ...{ at: eveningUtcMs, takenAt: eveningUtcMs, uTakenS: 0.1, type: 'image/png' as const, sha256: 'a', size: 3 },
    ...{ bytes: Buffer.of(1, 2, 3), note: null },
    ...change,
  });
  await store.insertFrame(db(), frame());
  await store.insertFrame(db(), frame({ bytes: Buffer.of(7), sha256: 'b' }));
  await store.insertFrame(db(), frame({ moment: 'swing-ended', at: eveningUtcMs + 9, size: 0, bytes: null, takenAt: null, note: 'away' }));
  const kept = await store.wholeFramesOf(db(), { labId: ofRig.labId, runId });
  expect(kept.map(({ sha256, bytes, note }) => [sha256, bytes, note])).toEqual([
    ['a', Buffer.of(1, 2, 3), null],
    ['a', null, 'away'],
  ]);
  expect(await store.sizeOfFrames(db(), { labId: ofRig.labId, runId })).toEqual({ frames: 2, bytes: 3 });
  expect(await store.findFrame(db(), { labId: ofRig.labId, runId, id: kept[1]?.id ?? '' })).toBeNull();
  expect(JSON.stringify(await store.framesOf(db(), { labId: ofRig.labId, runId }))).not.toContain('bytes');
});
