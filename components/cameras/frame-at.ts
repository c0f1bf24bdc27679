import type { FrameView } from '@/shared/contracts/cameras';

/** Names of the cameras that have frames, in the order of their first. */
export const camerasOf = (frames: readonly FrameView[]): string[] => [...new Set(frames.map(({ camera }) => camera))];

/** The frame of a camera that was the newest at `utcMs`; null before its first. `frames` by time. Pure. */
export function frameAt(frames: readonly FrameView[], camera: string, utcMs: number): FrameView | null {
  return frames.findLast((frame) => frame.camera === camera && Date.parse(frame.at) <= utcMs) ?? null;
}
