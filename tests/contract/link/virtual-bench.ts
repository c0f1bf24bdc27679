import type { VirtualClock } from '@/server/engine/virtual-clock';
import type { ByteLineFactory } from '@/server/interfaces/byte-line';
import type { SimulatedController } from '@/server/links/simulated-controller';
import type { LinkBench } from './bench';

/** For clocks on which only link and controller live: all their promises are done within a few turns. */
export const settle = async () => {
  for (let turn = 0; turn < 8; turn += 1) await null;
};

/** 2000-01-01T00:00:00Z. */
export const benchStartUtcMs = 946_684_800_000;

/** A controller in this process on a virtual clock. */
export function benchOn(clock: VirtualClock, controller: SimulatedController, factory: ByteLineFactory = controller.factory): LinkBench {
  const sync = (deed: () => void) => async () => deed();
  return {
    clock,
    factory,
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

/** Another device at the end of the line. */
export function babbler(clock: VirtualClock): ByteLineFactory {
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
