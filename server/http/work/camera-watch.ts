import { momentsIn, type AskedFrame } from '@/shared/camera/moments';
import type { Picture } from '@/shared/camera/picture';
import type { RunDriver } from '@/server/engine/run-driver';
import type { RunChange } from '@/server/engine/run-driver-parts';
import { sha256Hex } from '@/server/evaluation/sha256';
import { drawRig } from '@/server/ingest/drawn-camera';
import { NoPicture } from '@/server/interfaces/camera';
import type { Cancel } from '@/server/interfaces/clock';
import * as store from '@/server/store/cameras';
import { isPassing } from '@/server/store/failures';
import { isoOf } from '../maker';
import { readPassword } from '../kept-password';
import type { Services } from '../services';

/** Moments that wait for one camera; more are noted as missed. */
const MOST_WAITING = 8;
/** Of one run. */
const MOST_FRAMES = 1000;
const MOST_RUN_BYTES = 64 * 1_048_576;
/** While somebody looks: how old the newest picture gets before there is another, and for how long one look counts, ms. */
const LOOK_EVERY_MS = 4_000;
const LOOK_LASTS_MS = 20_000;
/** A picture that is sent belongs to a moment from so long before it, and until so long after it, ms. */
const SENT_BEFORE_MS = 1_000;
const SENT_AFTER_MS = 10_000;
/** What is known of a camera is told at least so often, ms. */
const TELL_MS = 15_000;
/** Runs whose moments are remembered. */
const MOST_RUNS = 200;

type NewFrame = Omit<store.FrameRecord, 'id'>;
type Waiting = AskedFrame & { runId: string };

interface Held {
  camera: store.CameraRecord;
  waiting: Waiting[];
  /** Taken, and not in the database yet. */
  unstored: NewFrame[];
  busy: boolean;
  askedMs: number;
  reason: string | null;
  tell: { reason: string | null; atMs: number } | null;
}

interface WatchParts {
  services: Services;
  /** Whether this process drives the rig: it alone asks cameras. */
  holds(rigId: string): boolean;
  paceMs?: number | undefined;
}

/** Asks cameras for frames at moments of runs, and for pictures while somebody looks. Runs never wait for it: what fails is a note. */
export class CameraWatch {
  private readonly held = new Map<string, Held>();
  private readonly seen = new Map<string, Set<string>>();
  private cancel: Cancel = () => undefined;
  private unsubscribe: () => void = () => undefined;
  private readonly running = new Set<Promise<void>>();
  private readonly stopping = new AbortController();
  private turn: Promise<void> = Promise.resolve();

  constructor(private readonly parts: WatchParts) {}

  start(): void {
    this.unsubscribe = this.parts.services.supervisor.onChange((driver, change) => this.changed(driver, change));
    this.turn = this.look().catch((error: unknown) => this.note(error));
    this.plan();
  }

  async stop(): Promise<void> {
    this.stopping.abort();
    this.unsubscribe();
    this.cancel();
    await this.turn;
    await Promise.all(this.running);
  }

  private plan(): void {
    if (this.stopping.signal.aborted) return;
    this.cancel = this.parts.services.clock.after(this.parts.paceMs ?? 1_000, () => {
      this.turn = this.look()
        .catch((error: unknown) => this.note(error))
        .then(() => this.plan());
    });
  }

  private note(error: unknown): void {
    this.parts.services.log.warn({ err: error }, 'the cameras could not be looked at');
  }

  private async look(): Promise<void> {
    const { services, holds } = this.parts;
    const known = (await store.allCameras(services.database.db)).filter(({ rigId }) => holds(rigId));
    const ids = new Set(known.map(({ id }) => id));
    for (const id of this.held.keys()) if (!ids.has(id)) this.held.delete(id);
    for (const camera of known) {
      const held = this.held.get(camera.id);
      if (held !== undefined) held.camera = camera;
      else this.held.set(camera.id, { camera, waiting: [], unstored: [], busy: false, askedMs: -Infinity, reason: null, tell: null });
    }
    for (const held of this.held.values()) {
      await this.storeFrames(held);
      if (held.camera.kind === 'pushed') await this.fetchSent(held);
      else this.work(held);
    }
  }

  /** Frames of a camera whose pictures are sent: the newest one, where it fits; one is waited for, but not for long. */
  private async fetchSent(held: Held): Promise<void> {
    const { clock, database } = this.parts.services;
    const { camera, waiting } = held;
    const newest = waiting.length === 0 ? null : await store.pictureOf(database.db, camera);
    for (let asked = waiting[0]; asked !== undefined; asked = waiting[0]) {
      const sinceMs = newest === null ? -Infinity : newest.takenAt - asked.utcMs;
      const fits = newest !== null && sinceMs >= -SENT_BEFORE_MS && sinceMs <= SENT_AFTER_MS;
      if (!fits && clock.utcMs() - asked.utcMs <= SENT_AFTER_MS) return;
      waiting.shift();
      const took = fits ? { ...newest, takenUtcMs: newest.takenAt } : `no picture of it came within ${String(SENT_AFTER_MS / 1000)} s`;
      held.reason = typeof took === 'string' ? took : null;
      this.keep(held, frameOf(camera, asked, took));
      await this.tell(held);
    }
    await this.storeFrames(held);
  }

  /** What a run saved: nothing is waited for. */
  private changed({ runId, parts: { start } }: RunDriver, { steps }: RunChange): void {
    const moments = momentsIn(steps, start.protocol, this.seenOf(runId));
    for (const held of moments.length === 0 ? [] : this.held.values()) {
      if (held.camera.rigId !== start.rigId) continue;
      for (const moment of moments) {
        const asked = { ...moment, runId };
        if (held.waiting.length < MOST_WAITING) held.waiting.push(asked);
        else this.keep(held, frameOf(held.camera, asked, 'it was still busy with the moments before'));
      }
      this.work(held);
    }
  }

  private seenOf(runId: string): Set<string> {
    const seen = this.seen.get(runId) ?? new Set();
    this.seen.set(runId, seen);
    const [oldest] = this.seen.keys();
    if (this.seen.size > MOST_RUNS && oldest !== undefined) this.seen.delete(oldest);
    return seen;
  }

  private work(held: Held): void {
    if (held.busy || this.stopping.signal.aborted || held.camera.kind === 'pushed') return;
    const asked = held.waiting.shift();
    if (asked === undefined && !this.isLookedAt(held)) return;
    held.busy = true;
    const taking = this.takeOne(held, asked ?? null).finally(() => {
      held.busy = false;
      this.running.delete(taking);
      this.work(held);
    });
    this.running.add(taking);
  }

  private isLookedAt({ camera, askedMs }: Held): boolean {
    const { clock } = this.parts.services;
    const { lookedAt } = camera;
    return lookedAt !== null && clock.utcMs() - lookedAt < LOOK_LASTS_MS && clock.monotonicMs() - askedMs >= LOOK_EVERY_MS;
  }

  private async takeOne(held: Held, asked: Waiting | null): Promise<void> {
    const { clock, database, log } = this.parts.services;
    held.askedMs = clock.monotonicMs();
    const took = await this.take(held.camera);
    held.reason = typeof took === 'string' ? took : null;
    if (asked !== null) this.keep(held, frameOf(held.camera, asked, took));
    try {
      if (typeof took !== 'string') await store.putPicture(database.db, held.camera, took);
      await this.tell(held);
      await this.storeFrames(held);
    } catch (error) {
      log.warn({ err: error, cameraId: held.camera.id }, 'what a camera gave is not stored yet');
    }
  }

  /** A picture, or why there is none. */
  private async take(camera: store.CameraRecord): Promise<Picture | string> {
    const { services } = this.parts;
    const { clock, stations, cameras, log, database } = services;
    const { kind, rigId, address, userName } = camera;
    try {
      if (kind === 'address') {
        const password = await readPassword(services, { of: 'camera', ...camera }, (sealed) =>
          store.sealPassword(database.db, camera, sealed),
        );
        if (password === undefined) return 'its password was kept by a server with another key: remove the camera and add it again';
        return await cameras.take({ address: address ?? '', userName, password }, this.stopping.signal);
      }
      const seen = stations.get(rigId)?.seen?.() ?? null;
      if (seen === null) return 'this rig is not part of the server, so it cannot be drawn';
      const takenUtcMs = clock.utcMs();
      return { bytes: drawRig(seen, takenUtcMs), type: 'image/png', takenUtcMs, uTakenS: 0.001 };
    } catch (error) {
      if (error instanceof NoPicture) return error.message;
      log.warn({ err: error, rigId }, 'a camera could not be asked');
      return 'it could not be asked; the log of the server says why';
    }
  }

  private keep(held: Held, frame: NewFrame): void {
    held.unstored.push(frame);
    if (held.unstored.length > MOST_WAITING) held.unstored.shift();
  }

  private async storeFrames({ unstored }: Held): Promise<void> {
    const { db } = this.parts.services.database;
    while (unstored.length > 0) {
      const frame = unstored.shift() as NewFrame;
      try {
        const size = await store.sizeOfFrames(db, frame);
        if (size.frames < MOST_FRAMES) await store.insertFrame(db, withinLimits(frame, size));
      } catch (error) {
        if (isPassing(error)) unstored.unshift(frame);
        throw error;
      }
    }
  }

  private async tell(held: Held): Promise<void> {
    const { clock, database } = this.parts.services;
    const { reason, camera } = held;
    const nowMs = clock.monotonicMs();
    if (held.tell !== null && held.tell.reason === reason && nowMs - held.tell.atMs < TELL_MS) return;
    await store.tellCameraStatus(database.db, camera, { askedAt: isoOf(clock.utcMs()), reason });
    held.tell = { reason, atMs: nowMs };
  }
}

function frameOf(camera: store.CameraRecord, { runId, seq, moment, utcMs }: Waiting, took: Picture | string): NewFrame {
  const none = { takenAt: null, uTakenS: null, type: null, sha256: null, size: 0, bytes: null };
  const about = { labId: camera.labId, cameraId: camera.id, cameraName: camera.name, runId, seq, moment, at: utcMs };
  if (typeof took === 'string') return { ...about, ...none, note: took };
  const { bytes, type, takenUtcMs, uTakenS } = took;
  const kept = { takenAt: takenUtcMs, uTakenS, type, sha256: sha256Hex(bytes), size: bytes.length, bytes: Buffer.from(bytes) };
  return { ...about, ...kept, note: null };
}

/** The last frame that a run may have says that it is the last; one for whose picture there is no room says so. */
function withinLimits(frame: NewFrame, size: { frames: number; bytes: number }): NewFrame {
  const without = { ...frame, takenAt: null, uTakenS: null, type: null, sha256: null, size: 0, bytes: null };
  if (size.frames === MOST_FRAMES - 1) return { ...without, note: `this run has ${String(MOST_FRAMES)} frames; no more are kept` };
  if (size.bytes + frame.size <= MOST_RUN_BYTES) return frame;
  return { ...without, note: `the frames of this run fill ${String(MOST_RUN_BYTES / 1_048_576)} MiB already` };
}
