import { decodeLine } from '@/firmware-protocol/codec';
import { VirtualClock } from '@/server/engine/virtual-clock';
import type { ByteLineFactory } from '@/server/interfaces/byte-line';
import type { LinkCommand, LinkEvent } from '@/server/interfaces/turntable-link';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController, type SimulatedControllerOptions } from '@/server/links/simulated-controller';
import type { RigMotion } from '@/shared/rig/document';
import { benchRig } from '@/tests/contract/link/bench';

const settle = async () => {
  for (let turn = 0; turn < 8; turn += 1) await null;
};

function night(options: Partial<SimulatedControllerOptions> & { driverRig?: RigMotion } = {}) {
  const clock = new VirtualClock(946_684_800_000, settle);
  const { driverRig, ...rest } = options;
  const controller = createSimulatedController({ clock, rig: benchRig, ...rest });
  const written: string[] = [];
  const factory: ByteLineFactory = {
    ...controller.factory,
    open: async (handlers) => {
      const line = await controller.factory.open(handlers);
      return {
        write: (bytes) => {
          written.push(bytes.trim());
          line.write(bytes);
        },
        close: () => line.close(),
      };
    },
  };
  const link = createLink({ factory, clock, rig: driverRig ?? options.rig ?? benchRig, epoch: 5 });
  const told: LinkEvent[] = [];
  link.subscribe((event) => told.push(event));
  link.setLeaseRule(() => true);
  const kinds = () => told.map(({ kind }) => kind);
  const orders = () => written.map(decodeLine).flatMap((item) => (item.kind === 'request' ? [item.order.word] : []));
  return { clock, controller, link, told, kinds, orders, written };
}

const move = (id: string, targetDeg: number, startUtcMs: number | null = null): LinkCommand => ({
  kind: 'move',
  id,
  targetDeg,
  speedDegS: 30,
  accelerationDegS2: 60,
  startUtcMs,
});
const last = <K extends LinkEvent['kind']>(told: LinkEvent[], kind: K) =>
  told.filter((event) => event.kind === kind).at(-1) as Extract<LinkEvent, { kind: K }> | undefined;

async function ready(options: Parameters<typeof night>[0] = {}) {
  const made = night(options);
  made.link.open();
  await made.clock.advance(1_000);
  expect(made.link.health().condition).toBe('ready');
  return made;
}

describe('the greeting', () => {
  test('is hello, limits, status, then a heartbeat of half a second', async () => {
    const { clock, orders } = await ready();
    await clock.advance(2_000);
    // What it remembers of before is read once: whether somebody was let in meanwhile.
    expect(orders().slice(0, 4)).toEqual(['hello', 'limits', 'status', 'events']);
    expect(orders().slice(4)).toEqual(Array.from({ length: 6 }, () => 'renew'));
  });

  test('says so when the controller would allow more than the rig document', async () => {
    const { link } = await ready({ driverRig: { ...benchRig, maxDeg: 90 } });
    expect(link.health().detail).toContain("limits are wider than the rig document's (-170.0 to 170.0 deg");
  });

  test('tells the state before anything was said as closed, and an order without a link as refused', async () => {
    const { link, told } = night();
    expect(link.health()).toMatchObject({ condition: 'closed', roundTripMs: null, clockOffsetMs: null });
    expect(link.controller()).toBeNull();
    link.send(move('early', 10));
    expect(told).toMatchObject([{ kind: 'refused', commandId: 'early', code: 'no-session' }]);
  });
});

describe('the motion lease', () => {
  test('is renewed only while the run loop allows it', async () => {
    const { clock, link, orders } = await ready();
    link.setLeaseRule(() => false);
    const before = orders().length;
    await clock.advance(3_000);
    expect(new Set(orders().slice(before))).toEqual(new Set(['status']));
  });

  test('is not renewed from the first stop on until the next motion is ordered', async () => {
    const { clock, link, orders } = await ready();
    link.send({ kind: 'hold', id: 'h' });
    const before = orders().length;
    await clock.advance(3_000);
    expect(orders().slice(before)).not.toContain('renew');
    link.send(move('m', 10));
    await clock.advance(3_000);
    expect(
      orders()
        .slice(before)
        .filter((word) => word !== 'status')
        .slice(0, 3),
    ).toEqual(['renew', 'move', 'renew']);
  });
});

describe('motions', () => {
  test('home from an unknown position: warned for 10 s, then told with its edge passes', async () => {
    const { clock, link, told, kinds } = await ready({ homed: false, warned: false, startDeg: 30 });
    expect(link.controller()).toMatchObject({ positionKnown: false, angleDeg: null });
    link.send({ kind: 'home', id: 'home' });
    await clock.advance(9_900);
    expect(kinds()).toEqual(['ready', 'accepted']);
    await clock.advance(10_000);
    expect(kinds()).toEqual(['ready', 'accepted', 'motion-began', 'edge', 'edge', 'homed']);
    // While the position is unknown a pass of the edge has no angle to tell.
    expect(last(told, 'edge')).toMatchObject({ angleDeg: null, direction: 'ccw' });
    expect(last(told, 'homed')).toMatchObject({ commandId: 'home', angleDeg: 0 });
    expect(link.controller()).toMatchObject({ positionKnown: true, angleDeg: 0, moving: false, driversOn: true });
  });

  test('a rig whose home is not at 0° counts from there', async () => {
    const rig = { ...benchRig, homeDeg: 12.5, minDeg: -100 };
    const { clock, link, told, controller } = await ready({ rig });
    link.send(move('m', -20));
    await clock.advance(5_000);
    expect(last(told, 'motion-ended')).toMatchObject({ angleDeg: -20, cause: 'done' });
    expect(controller.trueAngleDegAt(clock.utcMs())).toBeCloseTo(-20, 9);
    // The flag's edge is at 12.5°: the step after it is the first that is covered.
    expect(last(told, 'edge')).toMatchObject({ direction: 'cw', angleDeg: 12.49 });
  });

  test('orders that wait behind another one are refused by the controller, and overtaken by a stop', async () => {
    const { clock, link, told } = await ready();
    link.send(move('a', 100));
    link.send(move('b', 50));
    await clock.advance(200);
    expect(last(told, 'refused')).toMatchObject({ commandId: 'b', code: 'busy' });
    link.send(move('c', 20));
    link.send(move('d', 30));
    link.send({ kind: 'stop', id: 's', releaseDrivers: true });
    await clock.advance(3_000);
    expect(told.filter((event) => event.kind === 'refused').map((event) => [event.commandId, event.code])).toEqual([
      ['b', 'busy'],
      ['d', 'overtaken'],
      ['c', 'no-session'],
    ]);
    // Not a rig that is safe when free: the torque stays.
    expect(link.controller()).toMatchObject({ driversOn: true, positionKnown: true });
    expect(told.filter((event) => event.kind === 'motion-began')).toHaveLength(1);
  });

  test('stop releases the drivers where the rig is marked safe when free, and the position is lost', async () => {
    const { clock, link, told } = await ready({ rig: { ...benchRig, safeWhenFree: true } });
    link.send(move('a', 100));
    await clock.advance(1_000);
    link.send({ kind: 'stop', id: 's', releaseDrivers: true });
    await clock.advance(3_000);
    expect(last(told, 'standstill')).toMatchObject({ commandId: 's' });
    expect(link.controller()).toMatchObject({ driversOn: false, positionKnown: false });
  });

  test('lost supply ends a motion at once, with the position', async () => {
    const { clock, link, told, controller, kinds } = await ready();
    link.send(move('a', 100));
    await clock.advance(1_500);
    controller.loseSupply();
    await clock.advance(500);
    expect(kinds()).toEqual(['ready', 'accepted', 'motion-began', 'supply', 'motion-ended']);
    expect(last(told, 'motion-ended')).toMatchObject({ cause: 'supply', angleDeg: null });
    expect(link.controller()).toMatchObject({ supplyPresent: false, positionKnown: false });
  });

  test('an open interlock ends a motion, and a closed one is told and moves nothing', async () => {
    const { clock, link, told, controller } = await ready();
    link.send(move('a', 100));
    await clock.advance(1_500);
    controller.openInterlock();
    await clock.advance(1_000);
    controller.closeInterlock();
    await clock.advance(5_000);
    expect(told.flatMap((event) => (event.kind === 'interlock' ? [event.closed] : []))).toEqual([false, true]);
    expect(last(told, 'motion-ended')).toMatchObject({ cause: 'interlock' });
    link.send(move('b', 0, clock.utcMs() + 2_000));
    await clock.advance(500);
    expect(last(told, 'refused')).toMatchObject({ commandId: 'b', code: 'warning' });
  });
});

describe('a broken line', () => {
  test('at rest it is lost after 5 s without a valid reply, and closed, so that a hung port is let go', async () => {
    const { clock, controller, told, link } = await ready();
    const silentFromMs = clock.monotonicMs();
    controller.dropLine(9_000);
    await clock.advance(20_000, () => told.some(({ kind }) => kind === 'lost'));
    expect(clock.monotonicMs() - silentFromMs).toBeGreaterThan(4_400);
    expect(clock.monotonicMs() - silentFromMs).toBeLessThan(5_600);
    expect(last(told, 'lost')?.why).toBe('No valid reply from the simulated turntable for 5 s.');
    await clock.advance(12_000);
    expect(link.health().condition).toBe('ready');
    expect(last(told, 'ready')).toMatchObject({ sameBoot: true });
  });

  test('bytes that come late, all at once, are no loss', async () => {
    const { clock, controller, kinds, link } = await ready();
    controller.freeze(3_000);
    await clock.advance(10_000);
    expect(kinds()).toEqual(['ready']);
    expect(link.health()).toMatchObject({ condition: 'ready', reconnects: 0, discardedLines: 0 });
  });

  test('a stop that is asked for while it is broken goes out first of all when it is whole, and is confirmed', async () => {
    const { clock, link, controller, told, orders } = await ready();
    controller.unplug();
    await clock.advance(2_000);
    expect(link.health()).toMatchObject({ condition: 'lost' });
    link.send({ kind: 'stop', id: 's', releaseDrivers: false });
    const before = orders().length;
    controller.plug();
    await clock.advance(6_000);
    expect(orders().slice(before, before + 2)).toEqual(['stop', 'hello']);
    expect(last(told, 'standstill')).toMatchObject({ commandId: 's', angleDeg: 0 });
  });

  test('tries again with pauses that grow to 5 s', async () => {
    const { clock, link, controller } = await ready();
    controller.unplug();
    const tries: number[] = [];
    for (let ms = 0; ms < 40_000; ms += 50) {
      await clock.advance(50);
      if (link.health().reconnects > tries.length) tries.push(clock.monotonicMs());
    }
    const pauses = tries.slice(1).map((atMs, index) => Math.round((atMs - (tries[index] as number)) / 50) * 50);
    expect(pauses.slice(0, 7)).toEqual([500, 1_000, 2_000, 4_000, 5_000, 5_000, 5_000]);
    expect(link.health().detail).toContain('is not there; plug the controller in');
  });

  test('more events than one reading holds are all told, in order, with their own times', async () => {
    const { clock, controller, told } = await ready();
    controller.dropLine(4_000);
    const times: number[] = [];
    for (let turn = 0; turn < 20; turn += 1) {
      clock.after(150 * turn, () => {
        times.push(clock.utcMs());
        controller.turnArmKey(turn % 2 === 1);
      });
    }
    await clock.advance(8_000);
    const keys = told.flatMap((event) => (event.kind === 'arm-key' ? [event] : []));
    expect(keys.map(({ on }) => on)).toEqual(Array.from({ length: 20 }, (_, turn) => turn % 2 === 1));
    keys.forEach(({ at }, index) => expect(Math.abs(at.utcMs - (times[index] as number))).toBeLessThan(0.5));
  });

  test('events that have left the ring are passed over, the rest is told', async () => {
    const { clock, controller, told, link } = await ready();
    controller.dropLine(4_000);
    for (let turn = 0; turn < 60; turn += 1) clock.after(50 * turn, () => controller.turnArmKey(turn % 2 === 1));
    await clock.advance(10_000);
    expect(told.filter(({ kind }) => kind === 'arm-key')).toHaveLength(32);
    expect(link.health().condition).toBe('ready');
  });

  test('a motion that was going on is not another process’s business: its end is seen in the state', async () => {
    const made = await ready();
    made.link.send(move('a', 150));
    await made.clock.advance(1_000);
    await made.link.close();
    const link = createLink({ factory: made.controller.factory, clock: made.clock, rig: benchRig, epoch: 6 });
    const told: LinkEvent[] = [];
    link.subscribe((event) => told.push(event));
    link.open();
    await made.clock.advance(200);
    expect(link.controller()).toMatchObject({ moving: true });
    await made.clock.advance(4_000);
    // The higher epoch ended the lease of the driver before: the table is at rest, though no command of ours ended.
    expect(told.map(({ kind }) => kind)).toEqual(['ready']);
    expect(link.controller()).toMatchObject({ moving: false, positionKnown: true });
    await link.close();
  });
});

describe('the end', () => {
  test('a closed link says nothing more and leaves nothing behind', async () => {
    const { clock, link, orders, controller, told } = await ready();
    await link.close();
    const before = [orders().length, told.length];
    controller.openInterlock();
    await clock.advance(20_000);
    expect([orders().length, told.length]).toEqual(before);
    expect(link.health().condition).toBe('closed');
    link.open();
    await clock.advance(1_000);
    expect(last(told, 'ready')).toMatchObject({ sameBoot: true, controller: { interlockClosed: false } });
  });
});
