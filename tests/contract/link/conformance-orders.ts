import { tagOf } from '@/server/links/command-book';
import { tryLink } from '@/server/links/try-link';
import type { BenchMaker } from './bench';
import { RawPeer } from './raw-peer';
import type { Scene } from './scene';

/** Greeting, moves, and what is sent more than once. */
export function ordersConformance(maker: BenchMaker, scene: Scene): void {
  test('answers hello with what it is and how it stands', async () => {
    await scene.begin();
    await scene.watch.ready();
    const { controller, sameBoot } = await scene.watch.get('ready');
    expect(sameBoot).toBe(false);
    expect(controller).toMatchObject({ positionKnown: true, moving: false, interlockClosed: true, supplyPresent: true });
    expect(controller.bootId).toMatch(/^[0-9A-F]{8}$/);
    expect(scene.watch.link.health()).toMatchObject({ condition: 'ready', discardedLines: 0 });
  });

  test('tells who it is when a line is tried, in a sentence, without being moved or disturbed', async () => {
    await scene.begin();
    const trial = await scene.settled(tryLink({ factory: scene.bench.factory, clock: scene.bench.clock }));
    expect(trial).toMatchObject({ ok: true, firmware: maker.firmware });
    expect(trial.detail).toContain(`: firmware ${maker.firmware}, line protocol 1.0, `);
    expect(trial.detail).toMatch(/^A controller answers at .*It has: home flag, interlock, .*Nothing was moved\.$/);
  });

  test('begins a timed move at the time asked for and ends it on the exact microstep', async () => {
    await scene.begin();
    await scene.watch.ready();
    await scene.bench.pass(600);
    const targetDeg = 12.345;
    const startUtcMs = scene.bench.clock.utcMs() + 800;
    const id = scene.watch.move(targetDeg, startUtcMs);
    const began = await scene.watch.get('motion-began', { of: id });
    const ended = await scene.watch.get('motion-ended', { of: id });
    expect(Math.abs(began.at.utcMs - startUtcMs) / 1000).toBeLessThan(maker.beginToleranceS);
    expect(ended.cause).toBe('done');
    // 12.345° at 100 microsteps a degree: 1234.5, rounded to 1235.
    expect(ended.angleDeg).toBeCloseTo(12.35, 9);
    expect(await scene.bench.trueAngleDeg()).toBeCloseTo(12.35, 9);
    // v²/a = 15° is more than the way: a triangle of 2 √(s/a), s = 12.35° less where it stood (physics reference, K2).
    const wayDeg = Math.abs(12.35 - (began.angleDeg as number));
    const profileS = wayDeg > 15 ? wayDeg / 30 + 0.5 : 2 * Math.sqrt(wayDeg / 60);
    // Both stamps carry their own u; on a starved machine the clock model says so itself.
    const toleranceS = 0.0005 + 3 * Math.hypot(began.at.uS, ended.at.uS);
    expect(Math.abs((ended.at.utcMs - began.at.utcMs) / 1000 - profileS)).toBeLessThan(toleranceS);
    expect(scene.watch.order('accepted', 'motion-began', 'motion-ended')).toEqual(['accepted', 'motion-began', 'motion-ended']);
  });

  test('homes to the edge from either side of it, and stands there at the home angle', async () => {
    await scene.begin();
    await scene.watch.ready();
    for (const fromDeg of [3, -2]) {
      const away = scene.watch.move(fromDeg);
      await scene.watch.get('motion-ended', { of: away });
      const home = scene.watch.send((id) => ({ kind: 'home', id }));
      expect(await scene.watch.get('homed', { of: home })).toMatchObject({ angleDeg: 0 });
      expect(await scene.bench.trueAngleDeg()).toBeCloseTo(0, 9);
    }
    expect(scene.watch.all('reset')).toEqual([]);
    expect(scene.watch.link.health()).toMatchObject({ condition: 'ready', discardedLines: 0 });
  });

  test('refuses a beginning in the past and a target outside its travel, and says why', async () => {
    await scene.begin();
    await scene.watch.ready();
    const late = await scene.watch.get('refused', { of: scene.watch.move(1, scene.bench.clock.utcMs() - 5_000) });
    expect(late.code).toBe('past');
    const outside = await scene.watch.get('refused', { of: scene.watch.move(171) });
    expect(outside).toMatchObject({ code: 'travel' });
    expect(outside.message).toContain('170.000 deg');
    expect(scene.watch.all('motion-began')).toEqual([]);
  });

  test('carries a repeated request out once and sends the stored reply again', async () => {
    await scene.begin();
    const peer = await RawPeer.open(scene.bench, scene.epoch);
    await peer.ask({ word: 'renew' }, 1);
    const order = {
      word: 'move',
      tag: tagOf(`repeated ${scene.bench.clock.utcMs()}`),
      position: 300,
      speed: 3_000_000,
      acceleration: 6_000_000,
      beginUs: null,
    } as const;
    const move = peer.text(order, 2);
    const first = await peer.put(move);
    expect(await peer.put(move)).toBe(first);
    expect(await peer.put(move)).toBe(first);
    expect(first).toContain(' ok ');
    await scene.bench.until('the end of the motion', () => peer.events().some(({ what }) => what.word === 'ended'), 5_000);
    expect(await peer.put(move)).toBe(first);
    await peer.ask({ word: 'renew' }, 3);
    await scene.bench.pass(700);
    expect(peer.events().filter(({ what }) => what.word === 'began')).toHaveLength(1);
    // The number for another order, an older number, the same order under a new number.
    expect((await peer.ask({ word: 'limits' }, 3)).body).toMatchObject({ word: 'no', code: 'reused' });
    expect((await peer.ask({ word: 'renew' }, 1)).body).toMatchObject({ word: 'no', code: 'old' });
    expect((await peer.ask(order, 4)).body).toMatchObject({ word: 'no', code: 'repeat' });
    expect(await scene.bench.trueAngleDeg()).toBeCloseTo(3, 9);
    await peer.close();
  });
}
