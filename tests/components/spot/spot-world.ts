import { ApiProblem, ApiUnreachable } from '@/components/api/problem';
import { CameraRefused, type CameraEvents, type CameraFrame, type CameraPort } from '@/components/spot/camera';
import { SpotReader, type SpotPlan } from '@/components/spot/spot-reader';
import { SpotSender } from '@/components/spot/spot-sender';
import type { SpotPiece } from '@/shared/spot/buffer';
import { fitScale } from '@/shared/spot/scale';
import { drawSpot, seeded, usualSpot } from '../../support/drawn-spot';

/** The reader with a camera, a server and a time that are invented. */

export const startUtcMs = Date.UTC(2031, 1, 14, 20);
const region = { left: 20, top: 10, width: usualSpot.width, height: usualSpot.height };
export const picture = { width: 320, height: 240 };
export const plan: SpotPlan = {
  region,
  of: 'centre',
  light: 'all',
  scale: fitScale(
    [
      { px: 20, mm: 0 },
      { px: 120, mm: 50 },
    ],
    0.1,
  ),
  picture: { cameraId: 'eye 1', ...picture },
  target: { channel: 'light spot', token: 'a token of twenty letters' },
};

/** What a device keeps while its pages come and go. */
class Disk {
  full = false;
  readonly pieces = new Map<number, SpotPiece>();

  load = () => Promise.resolve([...this.pieces.values()].sort((a, b) => a.id - b.id));
  change = ({ put, remove }: { put: readonly SpotPiece[]; remove: readonly number[] }) => {
    if (this.full) return Promise.reject(new Error('The disk is full'));
    for (const piece of put) this.pieces.set(piece.id, piece);
    for (const id of remove) this.pieces.delete(id);
    return Promise.resolve();
  };
}

let pages = 0;

export class World {
  answers: 'yes' | 'away' | 'refuses' | 'revoked' = 'yes';
  readonly opened: (string | null)[] = [];
  plugged = true;
  awake = false;
  events: CameraEvents | null = null;
  private readonly drawn = new Map<number, Uint8ClampedArray>();

  constructor(
    readonly disk = new Disk(),
    readonly batches: string[] = [],
    public nowMs = 5000,
  ) {}

  /** The page is gone without a word, and is opened again somewhat later. */
  reloaded(): World {
    this.events = null;
    return new World(this.disk, this.batches, this.nowMs + 4000);
  }

  cameras: { id: string; name: string }[] = [];

  readonly camera: CameraPort = {
    list: () => Promise.resolve(this.cameras),
    open: (id, events) => {
      this.opened.push(id);
      if (!this.plugged) return Promise.reject(new CameraRefused('No camera is connected.'));
      this.events = events;
      return Promise.resolve({
        id: 'eye 1',
        name: 'Eye',
        holdSettings: () => Promise.resolve(['focus']),
        close: () => void (this.events = null),
      });
    },
  };
  readonly sender = new SpotSender({
    nowMs: () => this.nowMs,
    keep: { load: () => this.disk.load(), change: (change) => this.disk.change(change) },
    firstId: (pages += 1) * 1_000_000,
    send: (_, lines) => {
      if (this.answers === 'away') return Promise.reject(new ApiUnreachable());
      if (this.answers !== 'yes') return Promise.reject(problem(this.answers === 'refuses' ? 'unreadable-data' : 'wrong-token'));
      this.batches.push(lines);
      return Promise.resolve();
    },
  });
  readonly reader = new SpotReader(
    {
      camera: this.camera,
      device: {
        now: () => ({ awake: this.awake, battery: null, hidden: false }),
        keepAwake: () => void (this.awake = true),
        letSleep: () => void (this.awake = false),
        end: () => undefined,
      },
      sender: this.sender,
      // The server is 1 h behind the device's own clock, which nobody set.
      askTime: () => Promise.resolve({ sentMs: this.nowMs - 10, receivedMs: this.nowMs + 10, serverMs: startUtcMs + this.nowMs }),
      nowMs: () => this.nowMs,
      deviceUtcMs: () => startUtcMs + this.nowMs + 3_600_000,
    },
    plan,
  );

  /** Lets time pass, with `rateHz` pictures a second of a spot at column `x` of the picture. */
  async watch(seconds: number, { x = 90, rateHz = 10, size = picture } = {}): Promise<void> {
    for (let i = 0; i < seconds * rateHz; i += 1) {
      this.nowMs += 1000 / rateHz;
      this.events?.frame(this.frame(x, size));
      await this.reader.step();
    }
  }

  private frame(x: number, size: { width: number; height: number }): CameraFrame {
    return {
      capturedMs: this.nowMs - 30,
      stamped: 'capture',
      missed: 0,
      ...size,
      pixels: ({ left }) => this.pixels(x - left),
    };
  }

  private pixels(x: number): Uint8ClampedArray {
    const known = this.drawn.get(x);
    if (known !== undefined) return known;
    const { values } = drawSpot({ ...usualSpot, x }, seeded(17));
    const pixels = Uint8ClampedArray.from({ length: 4 * values.length }, (_, i) => values[i >> 2] as number);
    this.drawn.set(x, pixels);
    return pixels;
  }

  get samples(): { channel: string; time_utc: string; value: number }[] {
    return this.batches.flatMap((batch) => batch.split('\n').map((line) => JSON.parse(line)));
  }
}

const problem = (code: 'unreadable-data' | 'wrong-token') =>
  new ApiProblem({ type: `/problems/${code}`, title: code, status: 400, code, detail: `It is ${code}.` });

export async function reading(): Promise<World> {
  const world = new World();
  await world.reader.step();
  await world.reader.openCamera(null);
  world.reader.begin();
  return world;
}
