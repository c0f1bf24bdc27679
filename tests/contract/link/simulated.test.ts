import { VirtualClock } from '@/server/engine/virtual-clock';
import type { ByteLineFactory } from '@/server/interfaces/byte-line';
import { createSimulatedController } from '@/server/links/simulated-controller';
import { benchRig, type BenchMaker, type LinkBench } from './bench';
import { linkConformance } from './conformance';

const settle = async () => {
  for (let turn = 0; turn < 8; turn += 1) await null;
};

function benchOn(clock: VirtualClock, options: { version?: { major: number; minor: number }; stranger?: ByteLineFactory }): LinkBench {
  const controller = createSimulatedController({
    clock,
    rig: benchRig,
    ...(options.version === undefined ? {} : { version: options.version }),
  });
  const sync = (deed: () => void) => async () => deed();
  return {
    clock,
    factory: options.stranger ?? controller.factory,
    until: async (what, met, withinMs) => {
      await clock.advance(withinMs, met);
      if (!met()) throw new Error(`within ${withinMs} ms of simulated time there was no ${what}`);
    },
    pass: (ms) => clock.advance(ms),
    trueAngleDeg: async () => controller.trueAngleDegAt(clock.utcMs()),
    reset: sync(controller.reset),
    drop: async (ms) => controller.dropLine(ms),
    garbage: async (ms) => controller.garbage(ms),
    interlock: async (level) => (level === 'open' ? controller.openInterlock() : controller.closeInterlock()),
    armKey: async (level) => controller.turnArmKey(level === 'on'),
    unplug: sync(controller.unplug),
    plug: sync(controller.plug),
    dispose: async () => undefined,
  };
}

function babbler(clock: VirtualClock): ByteLineFactory {
  return {
    description: 'the simulated stranger',
    open: async ({ onLine }) => {
      let open = true;
      const talk = () => {
        if (!open) return;
        onLine('$GPX, 17 ~~~');
        clock.after(50, talk);
      };
      clock.after(50, talk);
      return {
        write: () => undefined,
        close: () => {
          open = false;
        },
      };
    },
  };
}

const maker: BenchMaker = {
  name: 'the simulated link',
  firmware: 'simulated',
  beginToleranceS: 0.0002,
  noiseMs: 1_000,
  make: async () => benchOn(new VirtualClock(946_684_800_000, settle), {}),
  makeStranger: async (kind) => {
    const clock = new VirtualClock(946_684_800_000, settle);
    return benchOn(clock, kind === 'babble' ? { stranger: babbler(clock) } : { version: { major: 2, minor: 0 } });
  },
  dispose: async () => undefined,
};

linkConformance(maker);
