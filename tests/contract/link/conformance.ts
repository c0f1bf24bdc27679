import type { BenchMaker } from './bench';
import { atTheRigConformance } from './conformance-at-the-rig';
import { haltsConformance } from './conformance-halts';
import { ordersConformance } from './conformance-orders';
import { strangersConformance } from './conformance-strangers';
import { troubleConformance } from './conformance-trouble';
import { Scene } from './scene';

const parts = {
  orders: ordersConformance,
  halts: haltsConformance,
  'at the rig': atTheRigConformance,
  trouble: troubleConformance,
  strangers: strangersConformance,
};

/** What every line to a controller must do, whatever is behind it. A line that runs in real time may leave parts out, and says why. */
export function linkConformance(
  maker: BenchMaker,
  which: readonly (keyof typeof parts)[] = ['orders', 'halts', 'at the rig', 'trouble', 'strangers'],
): void {
  describe(`a controller on ${maker.name}`, () => {
    const scene = new Scene(maker);
    afterEach(() => scene.end());
    afterAll(() => maker.dispose());
    for (const part of which) parts[part](maker, scene);
  });
}
