import { VirtualClock } from '@/server/engine/virtual-clock';
import { createEmulatedController } from '@/server/links/board/board-controller';
import { benchRig, type BenchMaker } from './bench';
import { linkConformance } from './conformance';
import { benchOn, benchStartUtcMs, settle } from './virtual-bench';

const maker: BenchMaker = {
  name: 'the emulated board',
  firmware: 'evenfall-1.0',
  // The board's bytes are 2.1 % faster than the rate that the host reckons with: 70 µs in a long reply.
  beginToleranceS: 0.0002,
  noiseMs: 1_000,
  make: async () => {
    const clock = new VirtualClock(benchStartUtcMs, settle);
    return benchOn(clock, createEmulatedController({ clock, rig: benchRig }));
  },
  makeStranger: null,
  dispose: async () => undefined,
};

linkConformance(maker);
