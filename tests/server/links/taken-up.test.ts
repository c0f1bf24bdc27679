import { VirtualClock } from '@/server/engine/virtual-clock';
import type { LinkCommand, LinkEvent } from '@/server/interfaces/turntable-link';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController } from '@/server/links/simulated-controller';
import { benchRig } from '@/tests/contract/link/bench';

const settle = async () => {
  for (let turn = 0; turn < 8; turn += 1) await null;
};
const move = (id: string, targetDeg: number): LinkCommand => ({
  kind: 'move',
  id,
  targetDeg,
  speedDegS: 30,
  accelerationDegS2: 60,
  startUtcMs: null,
});
const last = <K extends LinkEvent['kind']>(told: LinkEvent[], kind: K) =>
  told.filter((event) => event.kind === kind).at(-1) as Extract<LinkEvent, { kind: K }> | undefined;

describe('motions of another process', () => {
  /** A process that sends a motion and is gone `before` ms later; `away` ms after that, the link of another one. */
  async function takenUp(motion: LinkCommand, { before, away }: { before: number; away: number }) {
    const clock = new VirtualClock(946_684_800_000, settle);
    const controller = createSimulatedController({ clock, rig: benchRig });
    const process = (epoch: number) => {
      const link = createLink({ factory: controller.factory, clock, rig: benchRig, epoch });
      const told: LinkEvent[] = [];
      link.subscribe((event) => told.push(event));
      link.setLeaseRule(() => true);
      return { link, told };
    };
    const first = process(5);
    first.link.open();
    await clock.advance(1_000);
    first.link.send(motion);
    await clock.advance(before);
    await first.link.close();
    await clock.advance(away);
    return { ...process(6), clock, controller, first: first.told };
  }

  test('are told with the stamps that the controller kept, then ready, and nothing else of the past', async () => {
    const { clock, link, told, first } = await takenUp(move('a', 150), { before: 500, away: 20_000 });
    link.takeUp([{ kind: 'move', id: 'a' }]);
    link.open();
    await clock.advance(2_000);
    expect(told.map(({ kind }) => kind)).toEqual(['accepted', 'motion-began', 'motion-ended', 'ready']);
    const began = last(told, 'motion-began');
    // The clock is known anew, and its rate to 100 ppm only: over 20 s its uncertainty is 2 ms.
    expect(Math.abs((began?.at.utcMs ?? NaN) - (last(first, 'motion-began')?.at.utcMs ?? NaN))).toBeLessThan(5);
    expect(began?.at.uS).toBeGreaterThan(0.001);
    expect(last(told, 'motion-ended')).toMatchObject({ commandId: 'a', cause: 'lease' });
    await link.close();
  });

  test('are told on a line that was ready before, too, and ready is told once more', async () => {
    const { clock, link, told } = await takenUp(move('a', 10), { before: 1_500, away: 5_000 });
    link.open();
    await clock.advance(1_000);
    expect(told.map(({ kind }) => kind)).toEqual(['ready']);
    link.takeUp([{ kind: 'move', id: 'a' }]);
    await clock.advance(1_000);
    expect(told.map(({ kind }) => kind)).toEqual(['ready', 'accepted', 'motion-began', 'motion-ended', 'ready']);
    expect(last(told, 'motion-ended')).toMatchObject({ cause: 'done', angleDeg: 10 });
    await link.close();
  });

  test('of which the controller keeps nothing are let go: it may have restarted', async () => {
    const { clock, link, told, controller } = await takenUp(move('a', 150), { before: 500, away: 100 });
    controller.reset();
    await clock.advance(3_000);
    link.takeUp([{ kind: 'move', id: 'a' }]);
    link.open();
    await clock.advance(3_000);
    expect(told.map(({ kind }) => kind)).toEqual(['ready']);
    link.send({ kind: 'home', id: 'b' });
    await clock.advance(30_000);
    expect(told.filter((event) => 'commandId' in event && event.commandId === 'a')).toEqual([]);
    expect(last(told, 'motion-began')).toMatchObject({ commandId: 'b' });
    await link.close();
  });

  test('that happened before the last 32 events are let go too', async () => {
    const { clock, link, told, controller } = await takenUp(move('a', 10), { before: 1_500, away: 100 });
    for (let turn = 0; turn < 40; turn += 1) controller.turnArmKey(turn % 2 === 1);
    link.takeUp([{ kind: 'move', id: 'a' }]);
    link.open();
    await clock.advance(3_000);
    expect(told.map(({ kind }) => kind)).toEqual(['ready']);
    await link.close();
  });
});
