import { testWith, type BenchMaker } from './bench';
import { LinkWatch } from './link-watch';
import type { Scene } from './scene';

/** Noise, lost lines, other drivers, resets and strangers. */
export function troubleConformance(maker: BenchMaker, scene: Scene): void {
  test('finishes a motion through noise that is shorter than the lease, and counts what was dropped', async () => {
    await scene.begin();
    await scene.watch.ready();
    const move = scene.watch.move((await scene.bench.trueAngleDeg()) > 0 ? -100 : 100);
    await scene.watch.get('motion-began', { of: move });
    await scene.bench.garbage(maker.noiseMs);
    const ended = await scene.watch.get('motion-ended', { of: move });
    expect(ended.cause).toBe('done');
    expect(scene.watch.all('lost')).toEqual([]);
    expect(scene.watch.link.health().discardedLines).toBeGreaterThan(0);
  });

  test('is found again after its port disappeared in a motion, and the end of the motion is told with its own time', async () => {
    await scene.begin();
    await scene.watch.ready();
    const move = scene.watch.move((await scene.bench.trueAngleDeg()) > 0 ? -150 : 150);
    const began = await scene.watch.get('motion-began', { of: move });
    await scene.bench.unplug();
    expect((await scene.watch.get('lost')).why).not.toBe('');
    await scene.bench.pass(3_500);
    await scene.bench.plug();
    const back = await scene.watch.get('ready', { nth: 1, withinMs: 15_000 });
    expect(back.sameBoot).toBe(true);
    const ended = await scene.watch.get('motion-ended', { of: move });
    // The lease of 2 s lapsed while nobody could hear; the stamp is the controller's.
    expect(ended.cause).toBe('lease');
    expect(ended.at.utcMs - began.at.utcMs).toBeLessThan(4_500);
    expect(ended.angleDeg).toBeCloseTo(await scene.bench.trueAngleDeg(), 9);
    expect(scene.watch.order('lost', 'lease-lapsed', 'motion-ended', 'ready')).toEqual([
      'ready',
      'lost',
      'lease-lapsed',
      'motion-ended',
      'ready',
    ]);
    expect(scene.watch.link.health().reconnects).toBeGreaterThan(0);
  });

  test('is lost as soon as the lease must have lapsed when it falls silent in a motion', async () => {
    await scene.begin();
    await scene.watch.ready();
    const move = scene.watch.move((await scene.bench.trueAngleDeg()) > 0 ? -150 : 150);
    await scene.watch.get('motion-began', { of: move });
    const silentFromMs = scene.bench.clock.monotonicMs();
    await scene.bench.drop(5_000);
    await scene.watch.get('lost', { withinMs: 8_000 });
    // Sooner than the 5 s of a link at rest.
    expect(scene.bench.clock.monotonicMs() - silentFromMs).toBeLessThan(4_800);
    const hold = scene.watch.send((id) => ({ kind: 'hold', id }));
    await scene.watch.get('standstill', { of: hold, withinMs: 15_000 });
    expect((await scene.watch.get('motion-ended', { of: move })).cause).toBe('lease');
  });

  test('refuses a driver of an older epoch, in words', async () => {
    await scene.begin();
    await scene.watch.ready();
    await scene.watch.link.close();
    scene.watch = new LinkWatch(scene.bench, 0);
    scene.watch.link.open();
    expect((await scene.watch.get('refused-controller')).why).toMatch(/Another server has driven this controller \(under number \d+\)/);
    expect(scene.watch.link.health().condition).toBe('refused');
  });

  testWith(maker, 'reset')('loses its position in a reset in motion, tells so, and refuses to move until homed', async () => {
    await scene.begin();
    await scene.watch.ready();
    const boot = scene.watch.link.controller()?.bootId;
    const move = scene.watch.move((await scene.bench.trueAngleDeg()) > 0 ? -150 : 150);
    await scene.watch.get('motion-began', { of: move });
    await scene.bench.pass(600);
    await scene.bench.reset();
    const reset = await scene.watch.get('reset');
    expect(reset.bootId).not.toBe(boot);
    expect(await scene.watch.get('motion-ended', { of: move })).toMatchObject({ cause: 'reset', angleDeg: null });
    const back = await scene.watch.get('ready', { nth: 1 });
    expect(back).toMatchObject({ sameBoot: false, controller: { positionKnown: false, angleDeg: null, driversOn: false } });
    expect((await scene.watch.get('refused', { of: scene.watch.move(0) })).code).toBe('unknown');
  });
}
