import type { ControllerLimits } from '@/server/interfaces/turntable-link';
import { testWith, type BenchMaker } from './bench';
import type { Scene } from './scene';

/** What a person at the rig does: nudges and limits that are taught with the arm key turned, and the guard that is opened. */
export function atTheRigConformance(maker: BenchMaker, scene: Scene): void {
  testWith(maker, 'armKey')('turns by a nudge only while the arm key says that somebody is there, and never far', async () => {
    await scene.begin();
    await scene.watch.ready();
    const before = await scene.bench.trueAngleDeg();
    const turnDeg = before > 0 ? -1.5 : 1.5;
    await scene.bench.armKey('off');
    const keyOff = await scene.watch.get('refused', { of: scene.watch.send((id) => ({ kind: 'nudge', id, turnDeg })) });
    expect(keyOff).toMatchObject({ code: 'key', message: expect.stringContaining('the arm key is off') });
    await scene.bench.armKey('on');
    const nudge = scene.watch.send((id) => ({ kind: 'nudge', id, turnDeg }));
    const ended = await scene.watch.get('motion-ended', { of: nudge });
    expect(ended.cause).toBe('done');
    expect(ended.angleDeg).toBeCloseTo(before + turnDeg, 9);
    expect(await scene.bench.trueAngleDeg()).toBeCloseTo(before + turnDeg, 9);
    // A 36th of the travel of 340°, rounded up to a microstep (SPEC 8.9).
    const far = await scene.watch.get('refused', {
      of: scene.watch.send((id) => ({ kind: 'nudge', id, turnDeg: 9.46 })),
    });
    expect(far).toMatchObject({ code: 'travel', message: expect.stringContaining('9.450 deg at most') });
    expect(scene.watch.all('motion-began')).toHaveLength(1);
  });

  testWith(
    maker,
    'armKey',
    'reset',
  )('is taught other limits by a person at the rig, obeys them, and keeps them over a reset', async () => {
    await scene.begin();
    await scene.watch.ready();
    const wide = scene.watch.link.limits() as ControllerLimits;
    expect(wide).toMatchObject({ leastDeg: -170, greatestDeg: 170, maxSpeedDegS: 30, maxAccelerationDegS2: 60, homeSpeedDegS: 10 });
    const narrow = { leastDeg: -60.5, greatestDeg: 20, maxSpeedDegS: 12, maxAccelerationDegS2: 6, homeSpeedDegS: 5 };
    await scene.bench.armKey('off');
    expect(await scene.settled(scene.watch.link.teach(narrow))).toMatchObject({ taught: false, code: 'key' });
    await scene.bench.armKey('on');
    const wrongWay = await scene.settled(scene.watch.link.teach({ ...narrow, greatestDeg: -60.5 }));
    expect(wrongWay).toMatchObject({ taught: false, code: 'field', message: expect.stringContaining('below the greatest') });
    expect(scene.watch.link.limits()).toEqual(wide);
    expect(await scene.settled(scene.watch.link.teach(narrow))).toEqual({ taught: true, limits: narrow });
    expect((await scene.watch.get('refused', { of: scene.watch.move(20.01) })).message).toContain('20.000 deg');
    // A controller may take its time to write them down, some 0.1 s in an EEPROM; a reset meanwhile would leave the old ones whole.
    await scene.bench.pass(300);
    await scene.bench.reset();
    await scene.watch.get('ready', { nth: 1 });
    expect(scene.watch.link.limits()).toEqual(narrow);
    expect(await scene.settled(scene.watch.link.teach(wide))).toEqual({ taught: true, limits: wide });
  });

  testWith(maker, 'interlock')(
    'brakes when the interlock opens in a motion; closing it starts nothing, and the warning is due again',
    async () => {
      await scene.begin();
      await scene.watch.ready();
      const away = (await scene.bench.trueAngleDeg()) > 0 ? -150 : 150;
      const move = scene.watch.move(away);
      const began = await scene.watch.get('motion-began', { of: move });
      await scene.bench.pass(600);
      await scene.bench.interlock('open');
      const ended = await scene.watch.get('motion-ended', { of: move, withinMs: 60_000 });
      expect(ended.cause).toBe('interlock');
      const opened = await scene.watch.get('interlock');
      expect(opened.closed).toBe(false);
      // From 30°/s at 60°/s² within half a second, by the controller's own stamps.
      expect(ended.at.utcMs - opened.at.utcMs).toBeLessThan(520);
      expect(opened.at.utcMs).toBeGreaterThan(began.at.utcMs);
      expect((await scene.watch.get('refused', { of: scene.watch.move(away) })).code).toBe('interlock');
      const standsAt = await scene.bench.trueAngleDeg();
      await scene.bench.interlock('closed');
      await scene.watch.get('interlock', { nth: 1 });
      await scene.bench.pass(1_500);
      expect(await scene.bench.trueAngleDeg()).toBe(standsAt);
      expect(scene.watch.all('motion-began')).toHaveLength(1);
      expect(scene.watch.link.controller()).toMatchObject({ interlockClosed: true, warningDue: true, moving: false });
      expect(ended.angleDeg).toBeCloseTo(standsAt, 9);
    },
  );
}
