import { VirtualClock } from '@/server/engine/virtual-clock';
import { createSimulatedController } from '@/server/links/simulated-controller';
import { benchRig, type BenchMaker } from './bench';
import { linkConformance } from './conformance';
import { babbler, benchOn, benchStartUtcMs, settle } from './virtual-bench';

const newClock = () => new VirtualClock(benchStartUtcMs, settle);

const maker: BenchMaker = {
  name: 'the simulated link',
  firmware: 'simulated',
  beginToleranceS: 0.0002,
  noiseMs: 1_000,
  make: async () => {
    const clock = newClock();
    return benchOn(clock, createSimulatedController({ clock, rig: benchRig }));
  },
  makeStranger: async (kind) => {
    const clock = newClock();
    const controller = createSimulatedController({ clock, rig: benchRig, version: { major: 2, minor: 0 } });
    return kind === 'babble' ? benchOn(clock, controller, babbler(clock)) : benchOn(clock, controller);
  },
  dispose: async () => undefined,
};

linkConformance(maker);
