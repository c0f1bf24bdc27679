import { tryLink } from '@/server/links/try-link';
import type { BenchMaker } from './bench';
import type { Scene } from './scene';

/** Something else than a controller that can be spoken to, where a bench can put it at the end of its line. */
export function strangersConformance({ makeStranger }: BenchMaker, scene: Scene): void {
  if (makeStranger === null) return;

  test('another device that talks on the port is refused in words, and nothing of it is obeyed', async () => {
    await scene.begin(makeStranger('babble'));
    scene.watch.link.open();
    const { why } = await scene.watch.get('refused-controller', { withinMs: 15_000 });
    expect(why).toMatch(/^Something talks at .*, but not the controller's language: \d+ lines were dropped\./);
    expect(scene.watch.link.health().condition).toBe('refused');
    expect((await scene.watch.get('refused', { of: scene.watch.move(1) })).code).toBe('no-session');
    await scene.watch.link.close();
    const trial = await scene.settled(tryLink({ factory: scene.bench.factory, clock: scene.bench.clock }));
    expect(trial).toMatchObject({ ok: false, firmware: null });
    expect(trial.detail).toContain('not the controller');
  });

  test('a controller of another major version is refused with both numbers', async () => {
    await scene.begin(makeStranger('other-major'));
    scene.watch.link.open();
    const { why } = await scene.watch.get('refused-controller', { withinMs: 15_000 });
    expect(why).toMatch(/speaks version 2\.0 of the line protocol, this server version 1\.0/);
    expect(scene.watch.link.health().condition).toBe('refused');
  });
}
