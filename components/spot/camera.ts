import type { Region } from '@/shared/spot/intensities';

/** The browser's side of a camera: pictures with the moment they were taken. */

export interface CameraFrame {
  /** Monotonic ms: when it was taken, or, where the camera does not tell, when it was shown. */
  capturedMs: number;
  stamped: 'capture' | 'shown';
  /** Pictures since the one before that this page never saw. */
  missed: number;
  width: number;
  height: number;
  /** RGBA of a region, row by row; only while the frame is being told. */
  pixels(region: Region): Uint8ClampedArray;
}

export interface CameraEvents {
  frame(frame: CameraFrame): void;
  /** It was unplugged, or another program took it. */
  ended(): void;
}

export interface OpenCamera {
  id: string;
  name: string;
  /** Keeps exposure, focus and white balance as they are, where the camera lets that be done; says what it could not keep. */
  holdSettings(): Promise<string[]>;
  close(): void;
}

export interface CameraPort {
  /** @throws CameraRefused */
  open(id: string | null, events: CameraEvents): Promise<OpenCamera>;
  /** Cameras of this device; none before one was allowed. */
  list(): Promise<{ id: string; name: string }[]>;
}

/** There is no picture; says what would be right. */
export class CameraRefused extends Error {
  override readonly name = 'CameraRefused';
}

const refusals: Record<string, string> = {
  NotAllowedError: 'The browser was not allowed to use a camera. Allow it when it asks, or in its settings of this page.',
  NotFoundError: 'No camera is connected to this device. Plug it in.',
  OverconstrainedError: 'The camera that was read is not connected any more. Plug it in at the same socket, or choose another one.',
  NotReadableError: 'The camera does not give pictures: another program may be using it. Close that, or plug the camera in again.',
};

const wordsOfRefusal = (error: unknown) =>
  (error instanceof Error ? refusals[error.name] : undefined) ??
  `The camera could not be opened: ${error instanceof Error ? error.message : String(error)}.`;

/** As many pixels as help: more of them cost time and show the same spot. Never scaled by the browser, which would blur it. */
const wanted = { width: { ideal: 1280 }, height: { ideal: 720 }, frameRate: { ideal: 30 }, resizeMode: 'none' };

/** Cameras by the browser's getUserMedia, shown in `video`. */
export function browserCamera(video: () => HTMLVideoElement | null): CameraPort {
  const devices = () => (navigator as { mediaDevices?: MediaDevices }).mediaDevices;
  return {
    async list() {
      const all = (await devices()?.enumerateDevices()) ?? [];
      return all
        .filter(({ kind, deviceId }) => kind === 'videoinput' && deviceId !== '')
        .map(({ deviceId, label }, index) => ({ id: deviceId, name: label === '' ? `Camera ${index + 1}` : label }));
    },
    async open(id, events) {
      const media = devices();
      const screen = video();
      if (media === undefined || screen === null)
        throw new CameraRefused(
          'A browser gives a camera only to pages under https, or of this device itself. Open this page by such an address.',
        );
      if (typeof screen.requestVideoFrameCallback !== 'function')
        throw new CameraRefused('This browser does not tell when pictures are taken. Use a newer one.');
      try {
        const stream = await media.getUserMedia({
          audio: false,
          video: { ...wanted, ...(id === null ? {} : { deviceId: { exact: id } }) },
        });
        return await shown(screen, stream, events);
      } catch (error) {
        throw new CameraRefused(wordsOfRefusal(error));
      }
    },
  };
}

async function shown(video: HTMLVideoElement, stream: MediaStream, events: CameraEvents): Promise<OpenCamera> {
  const track = stream.getVideoTracks()[0];
  if (track === undefined) throw new Error('it gives no pictures');
  let open = true;
  const close = () => {
    open = false;
    for (const each of stream.getTracks()) each.stop();
    if (video.srcObject === stream) video.srcObject = null;
  };
  track.addEventListener('ended', () => {
    if (!open) return;
    close();
    events.ended();
  });
  video.srcObject = stream;
  try {
    await video.play();
  } catch (error) {
    close();
    throw error;
  }
  followFrames(video, { isOpen: () => open, frame: events.frame });
  return { id: track.getSettings().deviceId ?? '', name: track.label, holdSettings: () => heldSettings(track), close };
}

function followFrames(video: HTMLVideoElement, { isOpen, frame }: { isOpen(): boolean; frame: CameraEvents['frame'] }): void {
  const canvas = document.createElement('canvas');
  const drawing = canvas.getContext('2d', { willReadFrequently: true });
  let shownBefore: number | null = null;
  const pixels = ({ left, top, width, height }: Region): Uint8ClampedArray => {
    if (canvas.width !== width || canvas.height !== height) Object.assign(canvas, { width, height });
    drawing?.drawImage(video, left, top, width, height, 0, 0, width, height);
    return drawing?.getImageData(0, 0, width, height).data ?? new Uint8ClampedArray(4 * width * height);
  };
  const next = (nowMs: number, metadata: VideoFrameCallbackMetadata) => {
    if (!isOpen()) return;
    video.requestVideoFrameCallback(next);
    const missed = shownBefore === null ? 0 : Math.max(0, metadata.presentedFrames - shownBefore - 1);
    shownBefore = metadata.presentedFrames;
    const { captureTime, width, height } = metadata;
    frame({ capturedMs: captureTime ?? nowMs, stamped: captureTime === undefined ? 'shown' : 'capture', missed, width, height, pixels });
  };
  video.requestVideoFrameCallback(next);
}

/** What moves the picture's brightness or place by itself (W3C MediaStream Image Capture), and its name. */
const byItself = { exposureMode: 'exposure', focusMode: 'focus', whiteBalanceMode: 'white balance' } as const;

async function heldSettings(track: MediaStreamTrack): Promise<string[]> {
  const can = (track.getCapabilities?.() ?? {}) as Record<string, unknown>;
  const free: string[] = [];
  for (const [mode, name] of Object.entries(byItself)) {
    const modes = can[mode];
    if (!Array.isArray(modes) || !modes.includes('continuous')) continue;
    const held = modes.includes('manual') && (await applied(track, { [mode]: 'manual' }));
    if (!held) free.push(name);
  }
  return free;
}

const applied = (track: MediaStreamTrack, one: Record<string, string>) =>
  track.applyConstraints({ advanced: [one as MediaTrackConstraintSet] }).then(
    () => true,
    () => false,
  );
