import type { BenchMaker } from './bench';
import { linkConformance } from './conformance';
import { HardwareBench } from './hardware-bench';

/**
 * A controller board on a real port, named by `EVENFALL_TEST_PORT`. Read docs/wiring.md, "Try the board", before: the table turns by
 * itself, up to 170° to either side. `EVENFALL_TEST_HANDS=1` says that a person stands at the board and does what is asked on the screen.
 */
const path = process.env.EVENFALL_TEST_PORT;
const hands = process.env.EVENFALL_TEST_HANDS === '1';
jest.setTimeout(400_000);

if (path === undefined) {
  // reason: stands in the name of the test
  test.skip('a controller on a real port (EVENFALL_TEST_PORT names none)', () => undefined);
} else {
  const hardware = new HardwareBench(path);
  const noHands = 'needs a person at the board: EVENFALL_TEST_HANDS=1';
  const maker: BenchMaker = {
    name: path,
    firmware: 'evenfall-1.0',
    cannot: { interlock: 'the guard is opened by hand: docs/wiring.md, First turn', ...(hands ? {} : { armKey: noHands, reset: noHands }) },
    // An adapter keeps bytes back for up to 16 ms.
    beginToleranceS: 0.02,
    noiseMs: 400,
    make: () => hardware.make(),
    makeStranger: null,
    dispose: () => hardware.dispose(),
  };
  linkConformance(maker);
}
