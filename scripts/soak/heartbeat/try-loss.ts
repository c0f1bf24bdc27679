import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { motionOf } from '@/shared/protocol/durations';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { VirtualClock } from '@/server/engine/virtual-clock';
import type { LinkEvent } from '@/server/interfaces/turntable-link';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController, type SimulatedController } from '@/server/links/simulated-controller';
import type { SeededKinds } from '../seeded/try-seeds';

/** One swing on the production link in virtual time, whose sign of life ends for a while at some instant, or comes late all the way, from a seed. */

export const losses = ['line cut', 'bytes kept back', 'process gone', 'loop stuck'] as const;
export type Loss = (typeof losses)[number];

const START_UTC_MS = Date.UTC(2026, 2, 1, 22);
const READY_MS = 3_000;
const [FROM_DEG, TO_DEG] = [-60, 60];
const [SPEED_DEG_S, ACCELERATION_DEG_S2] = [6, 2];
const RAMP_MS = (1000 * SPEED_DEG_S) / ACCELERATION_DEG_S2;
/** The controller gives a driver up after so long without a sign of life (SPEC, motion lease). */
const TRIP_MS = 2_000;
/** Of the longest line at 115 200 bit/s, and of the instants between which the angle is looked at. */
const ON_THE_LINE_MS = 15;
const LOOK_MS = 10;
const SWING_MS = 1000 * ((TO_DEG - FROM_DEG) / SPEED_DEG_S) + RAMP_MS;
/** The longest that a busy server is late with all it says, so that two signs of life and an answer still fit into the lease, ms. */
const BUSY_MS = 400;
/** How long a loss lasts, so that some are over while the table still slows down; and how long the table is watched after it, ms. */
const [SHORTEST_LOSS_MS, LONGEST_LOSS_MS] = [2_500, 9_000];
const AFTERWARDS_MS = 3_000;

const settle = async () => {
  for (let turn = 0; turn < 12; turn += 1) await null;
};

interface Swing {
  clock: VirtualClock;
  controller: SimulatedController;
  events: LinkEvent[];
  angleDeg(): number;
  /** From now on the controller has no sign of life for so long. */
  lose: Record<Loss, (forMs: number) => void>;
}

/** The swing has been ordered, and begins. */
async function beginSwing(seed: number): Promise<Swing> {
  const clock = new VirtualClock(START_UTC_MS, settle);
  const rig = motionOf(demoRigWide);
  const controller = createSimulatedController({ clock, rig, seed, startDeg: FROM_DEG });
  const link = createLink({ factory: controller.factory, clock, rig, epoch: 1 });
  const events: LinkEvent[] = [];
  link.subscribe((event) => void events.push(event));
  let wants = true;
  link.setLeaseRule(() => wants);
  link.open();
  await clock.advance(READY_MS);
  const id = `swing-${seed}`;
  const move = { targetDeg: TO_DEG, speedDegS: SPEED_DEG_S, accelerationDegS2: ACCELERATION_DEG_S2, startUtcMs: null };
  link.send({ kind: 'move', id, ...move });
  const angleDeg = () => controller.trueAngleDegAt(clock.utcMs());
  const lose: Swing['lose'] = {
    'line cut': (forMs) => controller.dropLine(forMs),
    'bytes kept back': (forMs) => controller.freeze(forMs),
    'process gone': (forMs) => {
      void link.close();
      const next = createLink({ factory: controller.factory, clock, rig, epoch: 2 });
      next.setLeaseRule(() => true);
      clock.after(forMs, () => next.open());
    },
    'loop stuck': (forMs) => {
      wants = false;
      clock.after(forMs, () => void (wants = true));
    },
  };
  return { clock, controller, events, angleDeg, lose };
}

/** Ms until the table stands; null when it does not within `withinMs`. */
async function untilStill({ clock, angleDeg }: Swing, withinMs: number): Promise<number | null> {
  let before = angleDeg();
  for (let ms = LOOK_MS; ms <= withinMs; ms += LOOK_MS) {
    await clock.advance(LOOK_MS);
    const now = angleDeg();
    if (now === before) return ms;
    before = now;
  }
  return null;
}

/**
 * The sign of life ends at a random instant of a swing, and comes back later: what is wrong with how the table came to rest and stayed there.
 * `lateMs` is a fault to plant: the loss begins so much later than is counted.
 */
export async function tryLoss(loss: Loss, seed: number, lateMs = 0): Promise<string[]> {
  const swing = await beginSwing(seed);
  const random = xoroshiro128plus(seed * 7_919 + losses.indexOf(loss));
  // Far enough from both ends that the table is under way at the loss, and would be when the lease runs out.
  const atMs = uniformInt(random, 500, Math.floor(SWING_MS - TRIP_MS - RAMP_MS - 1_000));
  const forMs = uniformInt(random, SHORTEST_LOSS_MS, LONGEST_LOSS_MS);
  await swing.clock.advance(atMs);
  if (lateMs === 0) swing.lose[loss](forMs);
  else swing.clock.after(lateMs, () => swing.lose[loss](forMs));
  const stillMs = await untilStill(swing, SWING_MS);
  const boundMs = TRIP_MS + RAMP_MS + ON_THE_LINE_MS + 2 * LOOK_MS;
  const what = `${loss}, seed ${seed}, lost after ${atMs} ms for ${forMs} ms`;
  if (stillMs === null) return [`${what}: the swing was not brought to rest`];
  const stoodDeg = swing.angleDeg();
  if (stoodDeg > TO_DEG - 1) return [`${what}: the swing reached its end`];
  await swing.clock.advance(Math.max(0, forMs - stillMs) + AFTERWARDS_MS);
  if (swing.angleDeg() !== stoodDeg) return [`${what}: it moved again when the sign of life was back`];
  return stillMs > boundMs ? [`${what}: it stood after ${stillMs} ms only`] : [];
}

/** A server that is busy, and late with everything by a random time of up to `busyMs`, never loses the lease. */
export async function tryBusy(seed: number, busyMs = BUSY_MS): Promise<string[]> {
  const swing = await beginSwing(seed);
  const random = xoroshiro128plus(seed * 104_729 + 1);
  for (let leftMs = SWING_MS; leftMs > 0;) {
    const [lateMs, calmMs] = [uniformInt(random, 0, busyMs), uniformInt(random, 50, 1_500)];
    swing.controller.freeze(lateMs);
    await swing.clock.advance(lateMs + calmMs);
    leftMs -= lateMs + calmMs;
  }
  await swing.clock.advance(1_000);
  const ended = swing.events.find((event) => event.kind === 'motion-ended');
  const what = `a busy server, seed ${seed}`;
  if (swing.events.some(({ kind }) => kind === 'lease-lapsed')) return [`${what}: the lease lapsed`];
  return ended?.kind === 'motion-ended' && ended.cause === 'done' ? [] : [`${what}: the swing ended as ${JSON.stringify(ended ?? null)}`];
}

/** 1,000 losses, or 20,000 as the second figure; and more than 24 h of busy swings, of 23 s each. */
export const heartbeatKinds: SeededKinds = {
  ...Object.fromEntries(losses.map((loss) => [loss, { attempt: (seed: number) => tryLoss(loss, seed), first: 250, second: 5_000 }])),
  busy: { attempt: (seed) => tryBusy(seed), first: 3_800, second: 20_000 },
};
