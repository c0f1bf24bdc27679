import type { Clock } from '@/server/interfaces/clock';
import { threadClock } from '@/server/boot/machine-time';
import { createWorkerBoard } from '@/server/boot/worker-board';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { createEmulatedController } from '@/server/links/board/board-controller';
import type { SimulatedController } from '@/server/links/simulated-controller';
import { benchRig, type LinkBench } from '@/tests/contract/link/bench';
import { LinkWatch } from '@/tests/contract/link/link-watch';
import { benchOn, benchStartUtcMs, settle } from '@/tests/contract/link/virtual-bench';

/** The emulated board on virtual time in this thread, and on scaled time in a thread of its own: the same firmware, the same motion. */

/** No more, so that a busy machine's pause of 0.4 s is still shorter than the motion lease of 2 s. */
const FACTOR = 5;
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

/** Homes and turns by 100°; how long that took by the controller's edges, s, and where the table then stands. */
async function homeAndTurn(bench: LinkBench) {
  const watch = new LinkWatch(bench, 1);
  open.push(() => watch.link.close());
  await watch.ready();
  const home = watch.send((id) => ({ kind: 'home', id }));
  await watch.get('homed', { of: home, withinMs: 60_000 });
  const move = watch.move(100);
  const began = await watch.get('motion-began', { of: move });
  const ended = await watch.get('motion-ended', { of: move });
  await bench.pass(500);
  const angleDeg = await bench.trueAngleDeg();
  return { tookS: (ended.at.utcMs - began.at.utcMs) / 1000, uS: Math.hypot(began.at.uS, ended.at.uS), cause: ended.cause, angleDeg };
}

test('five times as fast as real time, the same turn takes as long by its own clock as on virtual time', async () => {
  const virtual = new VirtualClock(benchStartUtcMs, settle);
  const first = await homeAndTurn(benchOn(virtual, createEmulatedController({ clock: virtual, rig: benchRig, homed: false })));
  // 100° at 30°/s and 60°/s²: 100 / 30 + 30 / 60 s (a trapezoid), to within a microstep at its slow ends.
  expect(first.tookS).toBeCloseTo(100 / 30 + 30 / 60, 2);
  expect(first).toMatchObject({ cause: 'done', angleDeg: 100 });

  const clock = threadClock(FACTOR);
  const errors: unknown[] = [];
  const log = { error: (...words: unknown[]) => void errors.push(words) };
  const { controller, end } = createWorkerBoard({ rig: benchRig, seed: 1, file: null }, { clock, log });
  open.push(end);
  const realBeganMs = performance.now();
  const beganMs = clock.monotonicMs();
  const second = await homeAndTurn(realBench(clock, controller));
  const ratio = (clock.monotonicMs() - beganMs) / (performance.now() - realBeganMs);
  expect(errors).toEqual([]);
  expect(second).toMatchObject({ cause: 'done' });
  expect(second.angleDeg).toBeCloseTo(100, 9);
  expect(Math.abs(second.tookS - first.tookS)).toBeLessThan(4 * second.uS + 0.001);
  expect(ratio).toBeCloseTo(FACTOR, 2);
}, 60_000);
