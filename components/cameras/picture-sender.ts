import { ApiProblem } from '@/components/api/problem';
import type { CameraPort, OpenCamera } from '@/components/spot/camera';
import type { DeviceWatch } from '@/components/spot/device-watch';
import { ofDevice } from '@/shared/spot/warnings';

export type SenderCamera =
  | { kind: 'closed' | 'opening' }
  | { kind: 'open'; id: string; name: string }
  /** It was open and is away; it is looked for again and again. */
  | { kind: 'lost' | 'refused'; why: string };

export interface SenderView {
  camera: SenderCamera;
  sending: boolean;
  /** Pictures that the server took, and when it took the last one, monotonic ms. */
  sent: number;
  sentAtMs: number | null;
  /** Why the last picture did not come to the server, or why none is sent any more; null while all goes well. */
  trouble: string | null;
  /** What may end it: battery, sleep, a page that is not seen. */
  warnings: readonly string[];
}

export interface SenderParts {
  camera: CameraPort;
  device: Pick<DeviceWatch, 'now' | 'keepAwake' | 'letSleep'>;
  /** The picture that is shown now, as JPEG; null where there is none. */
  shot(): Promise<Blob | null>;
  /** Rejects where it was not taken. `ageS`: how long ago it was taken, s. */
  send(token: string, picture: Blob, ageS: number): Promise<void>;
  nowMs(): number;
}

const everyMs = 3000;
/** After failures one after the other, ms. */
const pausesMs = [3000, 5000, 10_000, 30_000];
const reopenMs = 3000;
/** A camera whose last picture is older than this has stopped, ms. */
const stoppedMs = 5000;

function wordsOf(error: unknown): string {
  if (error instanceof ApiProblem) return error.detail;
  const { name, message } = error as Error;
  return name === 'AbortError' ? 'The server does not answer.' : message;
}

/** Sends what a camera of this device shows, a picture every few seconds. Has no timers of its own: `step` is to be called some times a second. */
export class PictureSender {
  private state: SenderView = { camera: { kind: 'closed' }, sending: false, sent: 0, sentAtMs: null, trouble: null, warnings: [] };
  private open: OpenCamera | null = null;
  private wantedId: string | null = null;
  private takenMs: number | null = null;
  private failures = 0;
  private dueMs = { send: 0, reopen: 0 };
  /** Counts the wishes for a camera: one that opens after it was given up is closed at once. */
  private wish = 0;

  constructor(private readonly parts: SenderParts) {}

  view(): SenderView {
    return { ...this.state, warnings: this.state.sending ? ofDevice(this.parts.device.now(), 'the browser shows it no pictures') : [] };
  }

  /** Goes on as a page before this one did: the camera is looked for until it is there. */
  resume(): void {
    this.closeCamera();
    this.dueMs.reopen = 0;
    this.change({ camera: { kind: 'lost', why: 'The page was loaded anew.' } });
    this.begin();
  }

  async openCamera(id: string | null): Promise<void> {
    this.closeCamera();
    this.wantedId = id;
    this.change({ camera: { kind: 'opening' } });
    const { wish } = this;
    try {
      await this.opened();
    } catch (error) {
      if (wish === this.wish) this.change({ camera: { kind: 'refused', why: (error as Error).message } });
    }
  }

  closeCamera(): void {
    this.wish += 1;
    this.open?.close();
    this.open = null;
    this.takenMs = null;
    this.change({ camera: { kind: 'closed' } });
  }

  begin(): void {
    this.dueMs.send = 0;
    this.failures = 0;
    this.change({ sending: true, trouble: null });
    this.parts.device.keepAwake();
  }

  end(trouble: string | null = null): void {
    this.change({ sending: false, trouble });
    this.parts.device.letSleep();
  }

  async step(token: string): Promise<void> {
    const nowMs = this.parts.nowMs();
    if (this.state.camera.kind === 'lost' && nowMs >= this.dueMs.reopen) {
      this.dueMs.reopen = Infinity;
      await this.opened().catch(() => undefined);
      this.dueMs.reopen = this.parts.nowMs() + reopenMs;
    }
    if (!this.state.sending || this.state.camera.kind !== 'open' || nowMs < this.dueMs.send) return;
    this.dueMs.send = Infinity;
    await this.sendOne(token);
  }

  private async sendOne(token: string): Promise<void> {
    const { takenMs } = this;
    try {
      const picture = takenMs === null || this.parts.nowMs() - takenMs > stoppedMs ? null : await this.parts.shot();
      if (picture === null || takenMs === null) throw new Error('The camera gives no new pictures.');
      await this.parts.send(token, picture, (this.parts.nowMs() - takenMs) / 1000);
      this.failures = 0;
      this.change({ sent: this.state.sent + 1, sentAtMs: this.parts.nowMs(), trouble: null });
      this.dueMs.send = this.parts.nowMs() + everyMs;
    } catch (error) {
      this.failed(error);
    }
  }

  private failed(error: unknown): void {
    const pauseMs = pausesMs[Math.min(this.failures, pausesMs.length - 1)] ?? everyMs;
    this.failures += 1;
    this.dueMs.send = this.parts.nowMs() + pauseMs;
    if (error instanceof ApiProblem && error.code === 'wrong-token') this.end(error.detail);
    else this.change({ trouble: wordsOf(error) });
  }

  private async opened(): Promise<void> {
    const { wish } = this;
    const camera = await this.parts.camera.open(this.wantedId, {
      frame: ({ capturedMs }) => {
        this.takenMs = capturedMs;
      },
      ended: () => {
        if (wish !== this.wish) return;
        this.open = null;
        this.takenMs = null;
        this.dueMs.reopen = this.parts.nowMs() + reopenMs;
        this.change({ camera: { kind: 'lost', why: 'It was unplugged, or another program took it.' } });
      },
    });
    if (wish !== this.wish) return camera.close();
    this.open = camera;
    this.wantedId = camera.id;
    this.change({ camera: { kind: 'open', id: camera.id, name: camera.name } });
  }

  private change(part: Partial<SenderView>): void {
    this.state = { ...this.state, ...part };
  }
}
