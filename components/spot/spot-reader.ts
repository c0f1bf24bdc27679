import { figuresOf, healthAfter, noFrames, type SeenFrame, type SpotFigures, type SpotHealth } from '@/shared/spot/health';
import { intensitiesOf, type Light, type Region } from '@/shared/spot/intensities';
import { readSpot, type ReadingOf, type SpotReading } from '@/shared/spot/read-spot';
import { mmAt, uMmAt, type SpotScale } from '@/shared/spot/scale';
import { afterExchange, clockUMs, utcMsAt, type ServerClock } from '@/shared/spot/server-clock';
import { isSamePicture, regionFault, type MarkedPicture } from '@/shared/spot/setting';
import { warningsOf } from '@/shared/spot/warnings';
import type { CameraFrame, CameraPort, OpenCamera } from './camera';
import type { DeviceWatch } from './device-watch';
import { SpotSender, type SenderState, type SpotTarget } from './spot-sender';

/** What is to be read, and where it goes. */
export interface SpotPlan {
  region: Region | null;
  of: ReadingOf;
  light: Light;
  scale: SpotScale | null;
  /** The pictures that region and scale belong to. */
  picture: MarkedPicture | null;
  target: SpotTarget;
}

export type CameraState =
  | { kind: 'closed' }
  | { kind: 'opening' }
  /** `before`: the id that it had until the browser gave it this one. */
  | { kind: 'open'; name: string; id: string; before: string | null; free: string[] }
  /** It was open and is away; it is looked for again and again. */
  | { kind: 'lost'; why: string; sinceUtcMs: number }
  | { kind: 'refused'; why: string };

/** Time in which nothing was kept though it should have been. */
export interface Gap {
  fromUtcMs: number;
  toUtcMs: number;
}

export interface ReaderView {
  camera: CameraState;
  /** The pictures that come. */
  picture: MarkedPicture | null;
  health: SpotHealth;
  figures: SpotFigures;
  /** The last position, in the whole picture and on the scale. */
  spot: { px: number; uPx: number; widthPx: number; mm: number | null; uMm: number | null } | null;
  sending: boolean;
  sender: SenderState;
  /** The last gaps, newest first. */
  gaps: Gap[];
  clockUMs: number | null;
  warnings: string[];
}

export interface ReaderParts {
  camera: CameraPort;
  device: DeviceWatch;
  sender: SpotSender;
  /** One exchange with the server about the time; times of the device are monotonic ms. */
  askTime(): Promise<{ sentMs: number; receivedMs: number; serverMs: number }>;
  nowMs(): number;
  /** The device's own clock, UTC ms. */
  deviceUtcMs(): number;
}

const reopenMs = 3000;
/** How long a camera may find its exposure by itself before that is held. */
const settleMs = 3000;
const askTimeMs = 20_000;
/** While the server's time is known less well than this it is asked as often as a camera that is away is looked for. */
const goodClockMs = 20;
/** Longer than this without a kept sample is told as a gap, and twelve of them are remembered. */
const gapMs = 3000;
const gapsKept = 12;

/**
 * Reads a camera's pictures and hands what it read to the sender. Knows nothing of React, has no timers of its own: `step` is to be called some
 * times a second, and everything that is slow is begun there.
 */
export class SpotReader {
  private camera: CameraState = { kind: 'closed' };
  private open: OpenCamera | null = null;
  private wantedId: string | null = null;
  private wantedName: string | null = null;
  private picture: MarkedPicture | null = null;
  private health: SpotHealth = noFrames;
  private stamped: 'capture' | 'shown' = 'capture';
  private clock: ServerClock | null = null;
  private sending = false;
  private keptMs: number | null = null;
  private gaps: Gap[] = [];
  private dueMs = { reopen: 0, askTime: 0, hold: 0 };
  /** Counts the wishes for a camera: one that opens after it was given up is closed at once. */
  private wish = 0;

  constructor(
    private readonly parts: ReaderParts,
    private plan: SpotPlan,
  ) {}

  use(plan: SpotPlan): void {
    const { region, of, light } = this.plan;
    // What was read of another region, or of another side of the spot, is not to be mixed with what comes.
    if (plan.region !== region || plan.of !== of || plan.light !== light) this.health = { ...this.health, recent: [] };
    this.plan = plan;
  }

  /** Opens a camera, or the first one that is there; what was read of another one is forgotten. */
  async openCamera(id: string | null): Promise<void> {
    this.closeCamera();
    this.wantedId = id;
    this.wantedName = null;
    this.health = noFrames;
    this.camera = { kind: 'opening' };
    const { wish } = this;
    try {
      await this.opened();
    } catch (error) {
      if (wish === this.wish) this.camera = { kind: 'refused', why: (error as Error).message };
    }
  }

  closeCamera(): void {
    this.wish += 1;
    this.open?.close();
    this.open = null;
    this.camera = { kind: 'closed' };
    this.picture = null;
  }

  /** From now on what is read is kept and sent. */
  begin(): void {
    this.sending = true;
    this.keptMs = this.parts.nowMs();
    this.parts.device.keepAwake();
  }

  /** Goes on with the reading of a page before this one: its camera is looked for until it is there. */
  resume(camera: { id: string | null; name: string | null }): void {
    this.closeCamera();
    this.wantedId = camera.id;
    this.wantedName = camera.name;
    this.camera = { kind: 'lost', why: 'The page was loaded anew.', sinceUtcMs: this.utcNowMs() };
    this.dueMs.reopen = this.parts.nowMs();
    this.begin();
  }

  /** Nothing more is kept; what waits is still sent. */
  end(): void {
    this.sending = false;
    this.keptMs = null;
    this.parts.device.letSleep();
  }

  async step(): Promise<void> {
    const nowMs = this.parts.nowMs();
    const work: Promise<void>[] = [this.parts.sender.step(this.plan.target)];
    if (this.camera.kind === 'lost' && nowMs >= this.dueMs.reopen) {
      this.dueMs.reopen = Infinity;
      work.push(this.reopen());
    }
    if (this.sending && this.open !== null && nowMs >= this.dueMs.hold) {
      this.dueMs.hold = Infinity;
      work.push(this.hold(this.open));
    }
    if (nowMs >= this.dueMs.askTime) {
      this.dueMs.askTime = nowMs + askTimeMs;
      work.push(this.learnTime());
    }
    await Promise.all(work);
  }

  view(): ReaderView {
    const nowMs = this.parts.nowMs();
    const figures = figuresOf(this.health, nowMs);
    const uMs = this.clock === null ? null : clockUMs(this.clock, nowMs);
    const clockErrorMs = this.clock === null ? null : this.parts.deviceUtcMs() - utcMsAt(this.clock, nowMs);
    return {
      camera: this.camera,
      picture: this.picture,
      health: this.health,
      figures,
      spot: this.spotNow(),
      sending: this.sending,
      sender: this.parts.sender.now,
      gaps: this.gaps,
      clockUMs: uMs,
      warnings: warningsOf({
        health: this.health,
        figures,
        device: this.parts.device.now(),
        stamped: this.stamped,
        clockUMs: uMs,
        clockErrorMs,
      }),
    };
  }

  private spotNow(): ReaderView['spot'] {
    const reading = this.health.recent.at(-1)?.reading;
    if (reading?.kind !== 'spot' || this.camera.kind !== 'open') return null;
    const { px, uPx, widthPx } = reading;
    const { scale } = this.plan;
    return { px, uPx, widthPx, mm: scale === null ? null : mmAt(scale, px), uMm: scale === null ? null : uMmAt(scale, px, uPx) };
  }

  private async opened(): Promise<void> {
    const { wish } = this;
    const id = await this.idNow();
    const open = await this.parts.camera.open(id, { frame: (frame) => this.seen(frame), ended: () => this.lost() });
    if (wish !== this.wish) {
      open.close();
      return;
    }
    this.open = open;
    // The same camera again, never another one that happens to be there: its picture would show another place.
    const before = id === this.wantedId ? null : this.wantedId;
    this.wantedId = open.id === '' ? this.wantedId : open.id;
    this.wantedName = open.name;
    this.camera = { kind: 'open', name: open.name, id: open.id, before, free: [] };
    this.dueMs.hold = this.parts.nowMs() + settleMs;
  }

  /** Some browsers give a camera another id in each session: it is known again by its name, where only one bears that. */
  private async idNow(): Promise<string | null> {
    const { wantedId, wantedName } = this;
    if (wantedId === null || wantedName === null) return wantedId;
    const there = await this.parts.camera.list();
    const named = there.filter(({ name }) => name === wantedName);
    return there.some(({ id }) => id === wantedId) || named.length !== 1 ? wantedId : (named[0]?.id ?? wantedId);
  }

  private async hold(open: OpenCamera): Promise<void> {
    const free = await open.holdSettings();
    if (this.open === open && this.camera.kind === 'open') this.camera = { ...this.camera, free };
  }

  private lost(): void {
    this.open = null;
    this.camera = { kind: 'lost', why: 'It was unplugged, or another program took it.', sinceUtcMs: this.utcNowMs() };
    this.dueMs.reopen = this.parts.nowMs() + reopenMs;
  }

  private async reopen(): Promise<void> {
    const before = this.camera;
    try {
      await this.opened();
    } catch (error) {
      if (before.kind === 'lost' && this.camera === before) this.camera = { ...before, why: (error as Error).message };
      this.dueMs.reopen = this.parts.nowMs() + reopenMs;
    }
  }

  private async learnTime(): Promise<void> {
    try {
      this.clock = afterExchange(this.clock, await this.parts.askTime());
      if (clockUMs(this.clock, this.parts.nowMs()) <= goodClockMs) return;
    } catch {
      // What is known grows older, and its u with it.
    }
    this.dueMs.askTime = this.parts.nowMs() + reopenMs;
  }

  private utcNowMs(): number {
    return this.clock === null ? this.parts.deviceUtcMs() : utcMsAt(this.clock, this.parts.nowMs());
  }

  private seen(frame: CameraFrame): void {
    this.picture = { cameraId: this.open?.id ?? this.wantedId ?? '', width: frame.width, height: frame.height };
    this.stamped = frame.stamped;
    const { region, light, of } = this.plan;
    // The same picture told twice is one.
    if (region === null || regionFault(region, frame) !== null || frame.capturedMs === this.health.recent.at(-1)?.capturedMs) return;
    const light8 = intensitiesOf(frame.pixels(region), region, light);
    const reading = inPicture(readSpot(light8, of), region);
    const { capturedMs, missed } = frame;
    const { saturated, brightest } = light8;
    const seen: SeenFrame = { capturedMs, missed, reading, saturated, brightest };
    this.health = healthAfter(this.health, seen);
    if (this.sending) this.keep(frame, reading);
  }

  private keep(frame: CameraFrame, reading: SpotReading): void {
    const { scale, picture } = this.plan;
    const fits = picture !== null && this.picture !== null && isSamePicture(picture, this.picture);
    if (reading.kind !== 'spot' || scale === null || this.clock === null || !fits) return;
    if (this.keptMs !== null && frame.capturedMs - this.keptMs > gapMs) this.noteGap(this.keptMs, frame.capturedMs);
    this.keptMs = frame.capturedMs;
    this.parts.sender.take(this.plan.target.channel, { utcMs: utcMsAt(this.clock, frame.capturedMs), mm: mmAt(scale, reading.px) });
  }

  private noteGap(fromMs: number, toMs: number): void {
    const clock = this.clock;
    if (clock === null) return;
    this.gaps = [{ fromUtcMs: utcMsAt(clock, fromMs), toUtcMs: utcMsAt(clock, toMs) }, ...this.gaps].slice(0, gapsKept);
  }
}

/** The reading with its column counted in the whole picture. */
const inPicture = (reading: SpotReading, { left }: Region): SpotReading =>
  reading.kind === 'none' ? reading : { ...reading, px: reading.px + left };
