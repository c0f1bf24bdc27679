import { and, asc, count, eq, isNotNull, isNull, lt, or, sum } from 'drizzle-orm';
import type { CameraStatus } from '@/shared/contracts/cameras';
import type { Picture } from '@/shared/camera/picture';
import { cameraPictures, cameras, frames } from '@/db/schema';
import { one, type Handle } from './database';

export type CameraRecord = typeof cameras.$inferSelect;
export type FrameRecord = typeof frames.$inferSelect;
/** A frame without its picture. */
export type FrameFacts = Omit<FrameRecord, 'bytes'>;
type OfRig = Pick<CameraRecord, 'labId' | 'rigId'>;
type OfRun = Pick<FrameRecord, 'labId' | 'runId'>;

const counts = isNull(cameras.removedAt);

export async function insertCamera(
  db: Handle,
  camera: Pick<CameraRecord, 'labId' | 'rigId' | 'name' | 'kind' | 'address' | 'userName' | 'password' | 'tokenHash' | 'madeAt' | 'madeBy'>,
): Promise<CameraRecord> {
  return one(await db.insert(cameras).values(camera).returning());
}

/** Those that count, with when the newest picture of each was taken. */
export async function camerasOf(db: Handle, { labId, rigId }: OfRig): Promise<(CameraRecord & { takenAt: number | null })[]> {
  const rows = await db
    .select({ camera: cameras, takenAt: cameraPictures.takenAt })
    .from(cameras)
    .leftJoin(cameraPictures, and(eq(cameraPictures.labId, cameras.labId), eq(cameraPictures.cameraId, cameras.id)))
    .where(and(eq(cameras.labId, labId), eq(cameras.rigId, rigId), counts))
    .orderBy(asc(cameras.madeAt), asc(cameras.id));
  return rows.map(({ camera, takenAt }) => ({ ...camera, takenAt }));
}

/** Those that count, of all labs. */
export const allCameras = (db: Handle): Promise<CameraRecord[]> => db.select().from(cameras).where(counts);

/** Null where the rig has none with this id that counts. */
export async function removeCamera(
  db: Handle,
  camera: { labId: string; rigId: string; id: string; at: number; by: string },
): Promise<CameraRecord | null> {
  const { labId, rigId, id, at, by } = camera;
  const [row] = await db
    .update(cameras)
    .set({ removedAt: at, removedBy: by, userName: null, password: null, tokenHash: null })
    .where(and(eq(cameras.labId, labId), eq(cameras.rigId, rigId), eq(cameras.id, id), counts))
    .returning();
  if (row === undefined) return null;
  await db.delete(cameraPictures).where(and(eq(cameraPictures.labId, labId), eq(cameraPictures.cameraId, id)));
  return row;
}

/** In place of one that lay there readable. */
export async function sealPassword(db: Handle, { labId, id, password: readable }: CameraRecord, password: string): Promise<void> {
  if (readable === null) return;
  await db
    .update(cameras)
    .set({ password })
    .where(and(eq(cameras.labId, labId), eq(cameras.id, id), eq(cameras.password, readable)));
}

/** The camera that counts whose token has this hash. */
export async function cameraByHash(db: Handle, tokenHash: string): Promise<CameraRecord | null> {
  const [row] = await db
    .select()
    .from(cameras)
    .where(and(eq(cameras.tokenHash, tokenHash), counts));
  return row ?? null;
}

/** Looking is noted to two seconds. */
const lookStepMs = 2_000;

/** Somebody looks at the cameras of a rig. */
export async function noteLook(db: Handle, { labId, rigId }: OfRig, nowUtcMs: number): Promise<void> {
  const stale = or(isNull(cameras.lookedAt), lt(cameras.lookedAt, nowUtcMs - lookStepMs));
  await db
    .update(cameras)
    .set({ lookedAt: nowUtcMs })
    .where(and(eq(cameras.labId, labId), eq(cameras.rigId, rigId), counts, stale));
}

export async function tellCameraStatus(db: Handle, { labId, id }: Pick<CameraRecord, 'labId' | 'id'>, status: CameraStatus): Promise<void> {
  await db
    .update(cameras)
    .set({ status })
    .where(and(eq(cameras.labId, labId), eq(cameras.id, id)));
}

/** Keeps the newest picture of a camera in place of the one before. */
export async function putPicture(db: Handle, { labId, id }: Pick<CameraRecord, 'labId' | 'id'>, picture: Picture): Promise<void> {
  const { takenUtcMs: takenAt, uTakenS, type } = picture;
  const kept = { takenAt, uTakenS, type, bytes: Buffer.from(picture.bytes) };
  await db
    .insert(cameraPictures)
    .values({ labId, cameraId: id, ...kept })
    .onConflictDoUpdate({ target: [cameraPictures.labId, cameraPictures.cameraId], set: kept });
}

/** The newest picture of a camera that counts. */
export async function pictureOf(
  db: Handle,
  { labId, rigId, id }: { labId: string; rigId: string; id: string },
): Promise<typeof cameraPictures.$inferSelect | null> {
  const [row] = await db
    .select({ picture: cameraPictures })
    .from(cameraPictures)
    .innerJoin(cameras, and(eq(cameraPictures.labId, cameras.labId), eq(cameraPictures.cameraId, cameras.id)))
    .where(and(eq(cameras.labId, labId), eq(cameras.rigId, rigId), eq(cameras.id, id), counts));
  return row?.picture ?? null;
}

/** Keeps a frame; one that is there already stays as it is. */
export async function insertFrame(db: Handle, frame: Omit<FrameRecord, 'id'>): Promise<void> {
  await db.insert(frames).values(frame).onConflictDoNothing();
}

/** How many frames a run has, and how large they are together, bytes. */
export async function sizeOfFrames(db: Handle, { labId, runId }: OfRun): Promise<{ frames: number; bytes: number }> {
  const found = await db
    .select({ frames: count(), bytes: sum(frames.size) })
    .from(frames)
    .where(and(eq(frames.labId, labId), eq(frames.runId, runId)));
  return { frames: found[0]?.frames ?? 0, bytes: Number(found[0]?.bytes ?? 0) };
}

const facts = {
  id: frames.id,
  labId: frames.labId,
  runId: frames.runId,
  cameraId: frames.cameraId,
  cameraName: frames.cameraName,
  seq: frames.seq,
  moment: frames.moment,
  at: frames.at,
  takenAt: frames.takenAt,
  uTakenS: frames.uTakenS,
  type: frames.type,
  sha256: frames.sha256,
  size: frames.size,
  note: frames.note,
};

/** Frames of a run by time, without their pictures. */
export const framesOf = (db: Handle, { labId, runId }: OfRun): Promise<FrameFacts[]> =>
  db
    .select(facts)
    .from(frames)
    .where(and(eq(frames.labId, labId), eq(frames.runId, runId)))
    .orderBy(asc(frames.at), asc(frames.seq), asc(frames.cameraName), asc(frames.id));

/** The same with their pictures. */
export const wholeFramesOf = (db: Handle, { labId, runId }: OfRun): Promise<FrameRecord[]> =>
  db
    .select()
    .from(frames)
    .where(and(eq(frames.labId, labId), eq(frames.runId, runId)))
    .orderBy(asc(frames.at), asc(frames.seq), asc(frames.cameraName), asc(frames.id));

/** One frame that has a picture; null where the run has none with this id. */
export async function findFrame(db: Handle, { labId, runId, id }: OfRun & { id: string }): Promise<FrameRecord | null> {
  const own = and(eq(frames.labId, labId), eq(frames.runId, runId), eq(frames.id, id), isNotNull(frames.bytes));
  const [row] = await db.select().from(frames).where(own);
  return row ?? null;
}
