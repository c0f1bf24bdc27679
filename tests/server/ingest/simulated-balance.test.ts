import { VirtualClock } from '@/server/engine/virtual-clock';
import { feedSimulatedBalance } from '@/server/ingest/simulated-balance';
import type { SampleBatch } from '@/server/interfaces/sample-store';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController } from '@/server/links/simulated-controller';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { createSimulatedBalance } from '@/shared/physics/simulated-balance';
import type { RigMotion } from '@/shared/rig/document';

const startUtcMs = 946_684_800_000;
const settle = async () => {
  for (let turn = 0; turn < 8; turn += 1) await null;
};
const rig = { ...demoRigWide, noise: {} };
const motion = rig.motion as RigMotion;

function feed(sink: (batch: SampleBatch) => void | Promise<void>) {
  const clock = new VirtualClock(startUtcMs, settle);
  const controller = createSimulatedController({ clock, rig: motion });
  const balance = createSimulatedBalance({ rig, bigG: 6.6743e-11, seed: 1, rateHz: 10, startUtcMs });
  const errors: unknown[] = [];
  const { stop } = feedSimulatedBalance({
    clock,
    balance,
    angleDegAt: controller.trueAngleDegAt,
    sink,
    onError: (error) => errors.push(error),
  });
  return { clock, controller, stop, errors };
}

test('batches go out once a second, without a gap, in order', async () => {
  const batches: SampleBatch[] = [];
  const { clock, stop } = feed((batch) => void batches.push(batch));
  await clock.advance(10_000);
  expect(batches.map(({ utcMs }) => utcMs.length)).toEqual(Array.from({ length: 10 }, () => 10));
  const times = batches.flatMap(({ utcMs }) => Array.from(utcMs));
  expect(times).toEqual(Array.from({ length: 100 }, (_, index) => startUtcMs + 50 + 100 * index));
  stop();
  await clock.advance(10_000);
  expect(batches).toHaveLength(10);
});

test('the pendulum follows the turntable that the controller truly turns', async () => {
  const angles: number[] = [];
  const { clock, controller } = feed((batch) => void angles.push(...batch.value));
  const link = createLink({ factory: controller.factory, clock, rig: motion, epoch: 1 });
  link.setLeaseRule(() => true);
  link.open();
  await clock.advance(1_000);
  link.send({ kind: 'move', id: 'm', targetDeg: 20.18, speedDegS: 6, accelerationDegS2: 2, startUtcMs: null });
  await clock.advance(3 * 3600_000);
  await link.close();
  // Equilibrium of the wide rig at its torque maximum: 0.001186912843431 rad (physics reference, A4).
  expect(angles.at(-1) as number).toBeCloseTo(0.00118691, 6);
  expect(angles[5]).toBeCloseTo(0, 12);
});

test('a sink that refuses a batch is told of and the feed goes on', async () => {
  let count = 0;
  const { clock, errors } = feed(async () => {
    count += 1;
    if (count === 3) throw new Error('the store is away');
  });
  await clock.advance(6_000);
  expect(errors).toEqual([new Error('the store is away')]);
  expect(count).toBe(6);
});
