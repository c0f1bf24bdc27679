import type { BenchMaker } from './bench';
import type { Scene } from './scene';

/** Hold, stop and the motion lease. */
export function haltsConformance(_maker: BenchMaker, scene: Scene): void {
  test('cancels a waiting move on hold, without a step', async () => {
    await scene.begin();
    await scene.watch.ready();
    const before = await scene.bench.trueAngleDeg();
    const move = scene.watch.move(before > 0 ? -50 : 50, scene.bench.clock.utcMs() + 1_500);
    await scene.watch.get('accepted', { of: move });
    const hold = scene.watch.send((id) => ({ kind: 'hold', id }));
    expect((await scene.watch.get('motion-ended', { of: move })).cause).toBe('hold');
    await scene.watch.get('standstill', { of: hold });
    await scene.bench.pass(2_000);
    expect(scene.watch.all('motion-began')).toEqual([]);
    expect(await scene.bench.trueAngleDeg()).toBe(before);
  });

  test('comes to rest on stop in motion, ends the session’s motion, and moves again when ordered anew', async () => {
    await scene.begin();
    await scene.watch.ready();
    const move = scene.watch.move((await scene.bench.trueAngleDeg()) > 0 ? -100 : 100);
    await scene.watch.get('motion-began', { of: move });
    await scene.bench.pass(700);
    const stop = scene.watch.send((id) => ({ kind: 'stop', id, releaseDrivers: false }));
    const ended = await scene.watch.get('motion-ended', { of: move });
    const standstill = await scene.watch.get('standstill', { of: stop });
    expect(ended.cause).toBe('stop');
    expect(standstill.angleDeg).toBe(ended.angleDeg);
    expect(Math.abs(ended.angleDeg as number)).toBeLessThan(99);
    expect(await scene.bench.trueAngleDeg()).toBeCloseTo(ended.angleDeg as number, 9);
    expect(scene.watch.order('accepted', 'motion-ended', 'standstill').slice(-2)).toEqual(['motion-ended', 'standstill']);
    const again = scene.watch.move(0);
    expect((await scene.watch.get('motion-ended', { of: again })).cause).toBe('done');
  });

  test('decelerates when the motion lease is not renewed, within 2 s and a ramp', async () => {
    await scene.begin();
    await scene.watch.ready();
    const move = scene.watch.move((await scene.bench.trueAngleDeg()) > 0 ? -150 : 150);
    const began = await scene.watch.get('motion-began', { of: move });
    scene.watch.mayRenew = false;
    const lapsed = await scene.watch.get('lease-lapsed');
    const ended = await scene.watch.get('motion-ended', { of: move });
    expect(ended.cause).toBe('lease');
    expect(lapsed.at.utcMs - began.at.utcMs).toBeLessThanOrEqual(4_000);
    // From 30°/s with 60°/s²: half a second, as far as both instants are known where the line is a real one.
    const known = 0.005 + 3 * (lapsed.at.uS + ended.at.uS);
    expect(Math.abs((ended.at.utcMs - lapsed.at.utcMs) / 1000 - 0.5)).toBeLessThan(known);
    expect(scene.watch.all('lost')).toEqual([]);
    expect((await scene.watch.get('refused', { of: scene.watch.move(0) })).code).toBe('not-renewed');
  });
}
