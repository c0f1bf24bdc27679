import { encode, NO_SESSION } from '@/firmware-protocol/codec';
import { createLink } from '@/server/links/link-driver';
import { sealed } from '../fuzz/almost-lines';
import { lineFaults, type LineFault } from './faulty-line';
import { soakRig, type Scene } from './night';

/** One kind of trouble: what spoils the line, and what happens to the machine. */
export interface Situation {
  name: string;
  line?: LineFault;
  /** Share of lines that are hit. */
  share: number;
  uptimeS?: number;
  /** The controller restarts: nothing is known of what it did in the start before. */
  restarts?: true;
  act?(scene: Scene): void;
}

/** When the moves of a night wait, turn or rest, ms (see `night.ts`). */
const WAITING = { fromMs: 3_100, spanMs: 1_300 };
const MOVING = { fromMs: 4_600, spanMs: 1_500 };
const RESTING = { fromMs: 7_000, spanMs: 1_800 };
/** 32 bits of microseconds and of milliseconds, s. */
const WRAPS_S = { us: 2 ** 32 / 1e6, ms: 2 ** 32 / 1e3 };

const moment = ({ fromMs, spanMs }: { fromMs: number; spanMs: number }, { upTo }: Scene) => fromMs + upTo(spanMs);

const reset = (when: typeof WAITING) => (scene: Scene) => scene.at(moment(when, scene), () => restart(scene));

function restart({ controller, night, clock }: Scene): void {
  night.hazards.push({ kind: 'reset', atMs: clock.monotonicMs() });
  controller.reset('watchdog');
}

/** An input forbids motion for a while, then allows it again. */
const forbids = (kind: 'interlock' | 'supply', when: typeof WAITING) => (scene: Scene) => {
  const { at, upTo, controller, night, clock } = scene;
  const lastsMs = 20 + upTo(6_000);
  at(moment(when, scene), () => {
    const fromMs = clock.monotonicMs();
    night.hazards.push({ kind, atMs: fromMs });
    night.forbidden.push({ kind, fromMs, toMs: fromMs + lastsMs });
    if (kind === 'interlock') controller.openInterlock();
    else controller.loseSupply();
    at(lastsMs, () => (kind === 'interlock' ? controller.closeInterlock() : controller.returnSupply()));
  });
};

const lapse = (when: typeof WAITING) => (scene: Scene) => {
  scene.at(moment(when, scene), () => (scene.lease.mayRenew = false));
  scene.at(8_500, () => (scene.lease.mayRenew = true));
};

/** The line is dead for a while, again and again. */
function stuck({ at, upTo, controller }: Scene): void {
  for (let ms = 2_000; ms < 28_000; ms += 3_000 + upTo(5_000)) at(ms, () => controller.dropLine(200 + upTo(7_000)));
}

function unplugged({ at, upTo, controller }: Scene): void {
  for (let ms = 2_000; ms < 26_000; ms += 6_000 + upTo(6_000)) {
    at(ms, () => controller.unplug());
    at(ms + 100 + upTo(5_000), () => controller.plug());
  }
}

function slip(scene: Scene): void {
  const steps = 1 + scene.upTo(400);
  scene.night.slippedSteps = steps;
  scene.at(moment(MOVING, scene), () => scene.controller.slip(steps));
}

/** The controller restarts as an order reaches it, before or after its reply has gone. */
function resetAtCommand(scene: Scene): void {
  let left = 1 + scene.upTo(3);
  scene.onMove(() => {
    left -= 1;
    if (left === 0) scene.clock.after(scene.upTo(8), () => restart(scene));
  });
}

/** A driver that was replaced says hello once more after the controller restarted. */
function olderDriver(scene: Scene): void {
  reset(RESTING)(scene);
  scene.at(12_000 + scene.upTo(3_000), () => scene.controller.unplug());
  scene.at(15_500, () => {
    scene.controller.plug();
    const older = createLink({ factory: scene.controller.factory, clock: scene.clock, rig: soakRig, epoch: 6 });
    older.setLeaseRule(() => true);
    older.open();
    older.send({ kind: 'move', id: 'from the older driver', targetDeg: 55, speedDegS: 30, accelerationDegS2: 60, startUtcMs: null });
    scene.at(600, () => void older.close());
  });
}

/** A host of another major version on the same port: it greets again and again, and orders in words of its own (SPEC 14.4). */
function strangeHost({ at, upTo, interject }: Scene): void {
  for (let ms = 1_000 + upTo(2_000); ms < 28_000; ms += 800 + upTo(4_000))
    at(ms, () => {
      const request = { kind: 'request', epoch: 7, session: NO_SESSION, number: upTo(65_535) } as const;
      interject(encode({ ...request, order: { word: 'hello', major: 2, minor: upTo(9) } }));
      interject(sealed(`q 7 ${NO_SESSION} ${upTo(65_535)} turn ${upTo(3_000)} soon`));
    });
}

/** The nine kinds of fault of a serial line, each by itself; `refused`: the controller answers that it will not. */
export const serialFaults = ['drop', 'double', 'reorder', 'truncate', 'flip', 'delay', 'noise', 'stuck', 'refused'] as const;

export const situations: readonly Situation[] = [
  ...lineFaults.map((line) => ({ name: line, line, share: 0.15 })),
  { name: 'refused', line: 'refused', share: 0.15 },
  { name: 'reply-lost', line: 'reply-lost', share: 0.6 },
  { name: 'event-lost', line: 'event-lost', share: 0.6 },
  { name: 'stolen', line: 'stolen', share: 0.3 },
  { name: 'talker', line: 'talker', share: 0.5 },
  { name: 'stuck', share: 0, act: stuck },
  { name: 'unplugged', share: 0.02, act: unplugged },
  { name: 'reset-resting', share: 0.02, restarts: true, act: reset(RESTING) },
  { name: 'reset-moving', share: 0.02, restarts: true, act: reset(MOVING) },
  { name: 'reset-waiting', share: 0.02, restarts: true, act: reset(WAITING) },
  { name: 'reset-at-command', share: 0.02, restarts: true, act: resetAtCommand },
  { name: 'older-driver', share: 0, restarts: true, act: olderDriver },
  { name: 'strange-host', share: 0.02, act: strangeHost },
  { name: 'lease-moving', share: 0.02, act: lapse(MOVING) },
  { name: 'lease-waiting', share: 0.02, act: lapse(WAITING) },
  { name: 'interlock-moving', share: 0.02, act: forbids('interlock', MOVING) },
  { name: 'interlock-waiting', share: 0.02, act: forbids('interlock', WAITING) },
  { name: 'supply-moving', share: 0.02, act: forbids('supply', MOVING) },
  { name: 'supply-waiting', share: 0.02, act: forbids('supply', WAITING) },
  { name: 'slip', share: 0, act: slip },
  { name: 'wrap-us', line: 'mixed', share: 0.1, uptimeS: WRAPS_S.us - 5 },
  { name: 'wrap-ms', line: 'mixed', share: 0.1, uptimeS: WRAPS_S.ms - 5 },
];
