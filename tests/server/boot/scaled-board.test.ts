import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { Clock } from '@/server/interfaces/clock';
import { BoardMemory } from '@/server/boot/board-memory';
import { threadClock } from '@/server/boot/machine-time';
import { createWorkerBoard } from '@/server/boot/worker-board';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { commissionedSession, createEmulatedController } from '@/server/links/board/board-controller';
import { referenceFirmware } from '@/server/links/board/firmware-file';
import type { SimulatedController } from '@/server/links/simulated-controller';
import { benchRig, type LinkBench } from '@/tests/contract/link/bench';
import { LinkWatch } from '@/tests/contract/link/link-watch';
import { benchOn, benchStartUtcMs, settle } from '@/tests/contract/link/virtual-bench';

/** The emulated board on virtual time in this thread, and on scaled time in a thread of its own: the same firmware, the same motion. */

const FACTOR = 2;
const folder = mkdtempSync(join(tmpdir(), 'evenfall-scaled-'));
afterAll(() => rmSync(folder, { recursive: true }));
/** Real ms after which a test gives up. */
const GIVE_UP_MS = 20_000;

const open: (() => Promise<unknown>)[] = [];
afterEach(async () => {
  for (const close of open.splice(0)) await close();
});

function realBench(clock: Clock, controller: SimulatedController): LinkBench {
  const sleep = (ms: number) => new Promise<void>((done) => void clock.after(ms, done));
  return {
    ...benchOn(new VirtualClock(0, settle), controller),
    clock,
    until: async (what, met) => {
      for (const endMs = clock.monotonicMs() + GIVE_UP_MS * FACTOR; !met(); await sleep(50))
        if (clock.monotonicMs() > endMs) throw new Error(`there was no ${what}`);
    },
    pass: sleep,
    trueAngleDeg: async () => controller.trueAngleDegAt(clock.utcMs()),
  };
}

/**
 * Turns by 20°; how long that took by the controller's edges, s. A machine that stood still for longer than the motion lease ends the motion:
 * then it is tried again.
 */
async function turn(bench: LinkBench) {
  const watch = new LinkWatch(bench, 1);
  open.push(() => watch.link.close());
  await watch.ready();
  for (const targetDeg of [20, 0, 20]) {
    await bench.until('link', () => watch.link.health().condition === 'ready', 10_000);
    const move = watch.move(targetDeg);
    const ended = await watch.get('motion-ended', { of: move });
    const began = await watch.get('motion-began', { of: move });
    if (ended.cause !== 'done') continue;
    await bench.pass(500);
    const tookS = (ended.at.utcMs - began.at.utcMs) / 1000;
    return { targetDeg, tookS, uS: Math.hypot(began.at.uS, ended.at.uS), angleDeg: await bench.trueAngleDeg() };
  }
  throw new Error('no turn came to its end');
}

/** A board that was homed, and switched off for no longer than a restart of the server. */
function homedBoard(clock: Clock): string {
  const file = join(folder, 'board.bin');
  const session = commissionedSession({ rig: benchRig, homed: true, startSteps: 0 });
  new BoardMemory(file).save({ atUtcMs: clock.utcMs(), state: session.board.state() }, referenceFirmware());
  return file;
}

/** A reading of `clock` between two of the real one, ms. */
function bracketed(clock: Clock) {
  const realBeforeMs = performance.now();
  const clockMs = clock.monotonicMs();
  return { realBeforeMs, clockMs, realAfterMs: performance.now() };
}

test('twice as fast as real time, the same turn takes as long by its own clock as on virtual time', async () => {
  const virtual = new VirtualClock(benchStartUtcMs, settle);
  const first = await turn(benchOn(virtual, createEmulatedController({ clock: virtual, rig: benchRig })));
  // 20° at 30°/s and 60°/s²: 20 / 30 + 30 / 60 s (a trapezoid), to within a microstep at its slow ends.
  expect(first.tookS).toBeCloseTo(20 / 30 + 30 / 60, 2);
  expect(first.angleDeg).toBe(20);

  const clock = threadClock(FACTOR);
  const errors: unknown[] = [];
  const log = { error: (...words: unknown[]) => void errors.push(words) };
  const { controller, end } = createWorkerBoard({ rig: benchRig, seed: 1, file: homedBoard(clock) }, { clock, log });
  open.push(end);
  const began = bracketed(clock);
  const second = await turn(realBench(clock, controller));
  const ended = bracketed(clock);
  expect(errors).toEqual([]);
  expect(second.angleDeg).toBeCloseTo(second.targetDeg, 9);
  expect(Math.abs(second.tookS - first.tookS)).toBeLessThan(4 * second.uS + 0.001);
  // However long the process is kept waiting between two readings: the clock's span lies between what the real ones allow.
  expect(ended.clockMs - began.clockMs).toBeGreaterThan(FACTOR * (ended.realBeforeMs - began.realAfterMs) - 1);
  expect(ended.clockMs - began.clockMs).toBeLessThan(FACTOR * (ended.realAfterMs - began.realBeforeMs) + 1);
}, 90_000);
