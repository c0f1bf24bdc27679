import { addressOf, useLab, useLabQuery } from '@/components/api';
import { getCameraPicture, getFramePicture, listCameras, listFrames, type CameraView, type FrameView } from '@/shared/contracts/cameras';

/** Between two looks, ms; the server asks cameras for pictures as long as looks follow each other. */
const lookMs = 5_000;

/** The cameras of a rig, looked at: their pictures follow. */
export const useCameras = (rigId: string) => useLabQuery(listCameras, { params: { rigId }, query: { look: 'true' }, everyMs: lookMs });

/** Addresses of the pictures of a rig; null before a camera gave one. */
export function usePictureAddress(rigId: string): (camera: CameraView) => string | null {
  const { labId } = useLab();
  return ({ id, takenAt }) =>
    takenAt === null
      ? null
      : `${addressOf(getCameraPicture, { params: { labId, rigId, cameraId: id } })}?taken=${String(Date.parse(takenAt))}`;
}

/** Frames of a run by time; `everyMs` as long as the run goes on. */
export function useFrames(runId: string, everyMs?: number): readonly FrameView[] {
  const frames = useLabQuery(listFrames, { params: { runId }, ...(everyMs === undefined ? {} : { everyMs }) });
  return frames.data?.data.items ?? [];
}

export function useFrameAddress(runId: string): (frame: FrameView) => string {
  const { labId } = useLab();
  return ({ id }) => addressOf(getFramePicture, { params: { labId, runId, frameId: id } });
}
