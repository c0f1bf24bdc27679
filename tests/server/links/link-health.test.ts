import { VirtualClock } from '@/server/engine/virtual-clock';
import type { ByteLineFactory } from '@/server/interfaces/byte-line';
import type { Clock } from '@/server/interfaces/clock';
import type { LinkEvent } from '@/server/interfaces/turntable-link';
import { ClockModel } from '@/server/links/clock-model';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController } from '@/server/links/simulated-controller';
import { benchRig } from '@/tests/contract/link/bench';

const settle = async () => {
  for (let turn = 0; turn < 8; turn += 1) await null;
};

function bench(factoryOf: (inner: ByteLineFactory) => ByteLineFactory = (inner) => inner) {
  const virtual = new VirtualClock(946_684_800_000, settle);
  const wall = { stepMs: 0 };
  /** The wall clock of the host can be set; its monotonic clock cannot. */
  const clock: Clock = {
    monotonicMs: () => virtual.monotonicMs(),
    utcMs: () => virtual.utcMs() + wall.stepMs,
    after: (delayMs, task) => virtual.after(delayMs, task),
  };
  const controller = createSimulatedController({ clock: virtual, rig: benchRig, ratePpm: 40 });
  const link = createLink({ factory: factoryOf(controller.factory), clock, rig: benchRig, epoch: 5 });
  const told: LinkEvent[] = [];
  link.subscribe((event) => told.push(event));
  link.setLeaseRule(() => true);
  link.open();
  const steps = () => told.flatMap((event) => (event.kind === 'clock-stepped' ? [event] : []));
  return { virtual, wall, controller, link, told, steps };
}

test('the health tells who answers, how fast, and how its clock runs', async () => {
  const { virtual, link } = bench();
  expect(link.health()).toMatchObject({ roundTripP50Ms: null, driftPpm: null, bootId: null, protocol: null, droppedByController: null });
  await virtual.advance(120_000);
  const health = link.health();
  expect(health).toMatchObject({ firmware: 'simulated', protocol: '1.0', droppedByController: 0, retries: 0, higherEpoch: null });
  expect(health.bootId).toBe(link.controller()?.bootId);
  // 27 bytes out and 62 back at 115200 Bd, 10 bits each, and 92 µs of thought.
  expect(health.roundTripP50Ms).toBeGreaterThan(7);
  expect(health.roundTripP95Ms).toBeLessThan(9);
  expect(health.roundTripP95Ms).toBeGreaterThanOrEqual(health.roundTripP50Ms as number);
  expect(Math.abs((health.driftPpm as number) - 40)).toBeLessThan(2 * (health.driftUPpm as number));
  expect(health.driftUPpm).toBeLessThan(1);
  await link.close();
});

test('bytes and lines that were no message are counted at both ends, and so are repetitions', async () => {
  const { virtual, controller, link } = bench();
  await virtual.advance(2_000);
  controller.garbage(4_000);
  link.send({ kind: 'hold', id: 'h' });
  await virtual.advance(8_000);
  const health = link.health();
  expect(health.discardedLines).toBeGreaterThan(10);
  expect(health.discardedBytes).toBeGreaterThan(health.discardedLines);
  expect(health.droppedByController).toBeGreaterThan(0);
  expect(health.retries).toBeGreaterThan(0);
  await link.close();
});

test('another server with a higher epoch is named by it', async () => {
  const { virtual, controller, link } = bench();
  await virtual.advance(1_000);
  await link.close();
  const newer = createLink({ factory: controller.factory, clock: virtual, rig: benchRig, epoch: 9 });
  newer.open();
  await virtual.advance(1_000);
  await newer.close();
  link.open();
  await virtual.advance(1_000);
  expect(link.health()).toMatchObject({ condition: 'refused', higherEpoch: 9 });
  // Its lease was taken anew above that number: the controller listens again.
  link.raiseEpoch(10);
  await virtual.advance(10_000);
  expect(link.health()).toMatchObject({ condition: 'ready', higherEpoch: null });
  await link.close();
});

describe('a clock that steps', () => {
  test.each([-3_600_000, -1_000, 1_000, 3_600_000])(
    'the wall clock by %d ms: told once, and the times of a motion stay together',
    async (stepMs) => {
      const { virtual, wall, link, told, steps } = bench();
      await virtual.advance(5_000);
      link.send({ kind: 'move', id: 'm', targetDeg: 60, speedDegS: 30, accelerationDegS2: 60, startUtcMs: null });
      await virtual.advance(700);
      wall.stepMs = stepMs;
      await virtual.advance(5_000);
      expect(steps()).toMatchObject([{ clock: 'host', byMs: stepMs }]);
      const [began, ended] = ['motion-began', 'motion-ended'].map((kind) => told.find((event) => event.kind === kind)?.at.utcMs) as [
        number,
        number,
      ];
      // 60° at 30°/s with 60°/s²: 2.5 s by the controller; the label of the beginning was given before the step.
      expect(ended - began - stepMs).toBeCloseTo(2_500, 0);
      await virtual.advance(20_000);
      expect(steps()).toHaveLength(1);
      await link.close();
    },
  );

  test('a slow correction of the wall clock is no step', async () => {
    const { virtual, wall, link, steps } = bench();
    for (let turn = 0; turn < 100; turn += 1) {
      wall.stepMs += 0.25;
      await virtual.advance(500);
    }
    expect(steps()).toEqual([]);
    await link.close();
  });

  test("the controller's, without a restart, contradicts the model by its size", () => {
    let byUs = 0;
    const model = new ClockModel();
    const exchange = (atMs: number) => ({ t1Ms: atMs, t2Us: (atMs + 3) * 1000 + byUs, t3Us: (atMs + 3.1) * 1000 + byUs, t4Ms: atMs + 6.1 });
    for (let atMs = 0; atMs < 60_000; atMs += 500) {
      expect(model.contradiction(exchange(atMs))).toBe(0);
      model.add({ ...exchange(atMs), outMs: 2.5, inMs: 2.5 });
    }
    byUs = 40_000;
    expect(model.contradiction(exchange(60_000))).toBeCloseTo(40, 1);
    byUs = -40_000;
    expect(model.contradiction(exchange(60_000))).toBeCloseTo(-40, 1);
  });

  test('a line that keeps bytes back for seconds is no step of a clock', async () => {
    const { virtual, controller, link, steps } = bench();
    await virtual.advance(20_000);
    for (let turn = 0; turn < 10; turn += 1) {
      controller.freeze(300 + 137 * turn);
      await virtual.advance(3_000);
    }
    expect(steps()).toEqual([]);
    await link.close();
  });
});
