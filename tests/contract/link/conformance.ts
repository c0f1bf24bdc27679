import { tryLink } from '@/server/links/try-link';
import { type BenchMaker, type LinkBench } from './bench';
import { LinkWatch } from './link-watch';
import { RawPeer } from './raw-peer';

/** What every line to a controller must do, whatever is behind it. */
export function linkConformance(maker: BenchMaker): void {
  describe(`a controller on ${maker.name}`, () => {
    let bench: LinkBench;
    let watch: LinkWatch;
    let epoch = 0;

    const begin = async (made: Promise<LinkBench> = maker.make()) => {
      bench = await made;
      epoch += 1;
      watch = new LinkWatch(bench, epoch);
    };
    afterEach(async () => {
      await watch.link.close();
      await bench.dispose();
    });
    afterAll(() => maker.dispose());

    test('answers hello with what it is and how it stands', async () => {
      await begin();
      await watch.ready();
      const { controller, sameBoot } = await watch.get('ready');
      expect(sameBoot).toBe(false);
      expect(controller).toMatchObject({ positionKnown: true, moving: false, interlockClosed: true, supplyPresent: true });
      expect(controller.bootId).toMatch(/^[0-9A-F]{8}$/);
      expect(watch.link.health()).toMatchObject({ condition: 'ready', discardedLines: 0 });
    });

    test('tells who it is when a line is tried, in a sentence, without being moved or disturbed', async () => {
      await begin();
      const trial = await settled(tryLink({ factory: bench.factory, clock: bench.clock }));
      expect(trial).toMatchObject({ ok: true, firmware: 'simulated' });
      expect(trial.detail).toMatch(
        /^A controller answers at .*: firmware simulated, line protocol 1\.0, .*It has: home flag, interlock, .*Nothing was moved\.$/,
      );
    });

    test('begins a timed move at the time asked for and ends it on the exact microstep', async () => {
      await begin();
      await watch.ready();
      await bench.pass(600);
      const targetDeg = 12.345;
      const startUtcMs = bench.clock.utcMs() + 800;
      const id = watch.move(targetDeg, startUtcMs);
      const began = await watch.get('motion-began', { of: id });
      const ended = await watch.get('motion-ended', { of: id });
      expect(Math.abs(began.at.utcMs - startUtcMs) / 1000).toBeLessThan(maker.beginToleranceS);
      expect(ended.cause).toBe('done');
      // 12.345° at 100 microsteps a degree: 1234.5, rounded to 1235.
      expect(ended.angleDeg).toBeCloseTo(12.35, 9);
      expect(await bench.trueAngleDeg()).toBeCloseTo(12.35, 9);
      // v²/a = 15° is more than the way: a triangle of 2 √(s/a), s = 12.35° less where it stood (physics reference, K2).
      const wayDeg = Math.abs(12.35 - (began.angleDeg as number));
      const profileS = wayDeg > 15 ? wayDeg / 30 + 0.5 : 2 * Math.sqrt(wayDeg / 60);
      // Both stamps carry their own u; on a starved machine the clock model says so itself.
      const toleranceS = 0.0005 + 3 * Math.hypot(began.at.uS, ended.at.uS);
      expect(Math.abs((ended.at.utcMs - began.at.utcMs) / 1000 - profileS)).toBeLessThan(toleranceS);
      expect(watch.order('accepted', 'motion-began', 'motion-ended')).toEqual(['accepted', 'motion-began', 'motion-ended']);
    });

    test('refuses a beginning in the past and a target outside its travel, and says why', async () => {
      await begin();
      await watch.ready();
      const late = await watch.get('refused', { of: watch.move(1, bench.clock.utcMs() - 5_000) });
      expect(late.code).toBe('past');
      const outside = await watch.get('refused', { of: watch.move(171) });
      expect(outside).toMatchObject({ code: 'travel' });
      expect(outside.message).toContain('170.000 deg');
      expect(watch.all('motion-began')).toEqual([]);
    });

    test('carries a repeated request out once and sends the stored reply again', async () => {
      await begin();
      const peer = await RawPeer.open(bench, epoch);
      await peer.ask({ word: 'renew' }, 1);
      const order = {
        word: 'move',
        tag: `0000${1000 + epoch}`,
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
      await bench.until('the end of the motion', () => peer.events().some(({ what }) => what.word === 'ended'), 5_000);
      expect(await peer.put(move)).toBe(first);
      await peer.ask({ word: 'renew' }, 3);
      await bench.pass(700);
      expect(peer.events().filter(({ what }) => what.word === 'began')).toHaveLength(1);
      // The number for another order, an older number, the same order under a new number.
      expect((await peer.ask({ word: 'limits' }, 3)).body).toMatchObject({ word: 'no', code: 'reused' });
      expect((await peer.ask({ word: 'renew' }, 1)).body).toMatchObject({ word: 'no', code: 'old' });
      expect((await peer.ask(order, 4)).body).toMatchObject({ word: 'no', code: 'repeat' });
      expect(await bench.trueAngleDeg()).toBeCloseTo(3, 9);
      await peer.close();
    });

    test('cancels a waiting move on hold, without a step', async () => {
      await begin();
      await watch.ready();
      const before = await bench.trueAngleDeg();
      const move = watch.move(before > 0 ? -50 : 50, bench.clock.utcMs() + 1_500);
      await watch.get('accepted', { of: move });
      const hold = watch.send((id) => ({ kind: 'hold', id }));
      expect((await watch.get('motion-ended', { of: move })).cause).toBe('hold');
      await watch.get('standstill', { of: hold });
      await bench.pass(2_000);
      expect(watch.all('motion-began')).toEqual([]);
      expect(await bench.trueAngleDeg()).toBe(before);
    });

    test('comes to rest on stop in motion, ends the session’s motion, and moves again when ordered anew', async () => {
      await begin();
      await watch.ready();
      const move = watch.move((await bench.trueAngleDeg()) > 0 ? -100 : 100);
      await watch.get('motion-began', { of: move });
      await bench.pass(700);
      const stop = watch.send((id) => ({ kind: 'stop', id, releaseDrivers: false }));
      const ended = await watch.get('motion-ended', { of: move });
      const standstill = await watch.get('standstill', { of: stop });
      expect(ended.cause).toBe('stop');
      expect(standstill.angleDeg).toBe(ended.angleDeg);
      expect(Math.abs(ended.angleDeg as number)).toBeLessThan(99);
      expect(await bench.trueAngleDeg()).toBeCloseTo(ended.angleDeg as number, 9);
      expect(watch.order('accepted', 'motion-ended', 'standstill').slice(-2)).toEqual(['motion-ended', 'standstill']);
      const again = watch.move(0);
      expect((await watch.get('motion-ended', { of: again })).cause).toBe('done');
    });

    test('decelerates when the motion lease is not renewed, within 2 s and a ramp', async () => {
      await begin();
      await watch.ready();
      const move = watch.move((await bench.trueAngleDeg()) > 0 ? -150 : 150);
      const began = await watch.get('motion-began', { of: move });
      watch.mayRenew = false;
      const lapsed = await watch.get('lease-lapsed');
      const ended = await watch.get('motion-ended', { of: move });
      expect(ended.cause).toBe('lease');
      expect(lapsed.at.utcMs - began.at.utcMs).toBeLessThanOrEqual(4_000);
      // From 30°/s with 60°/s²: half a second.
      expect((ended.at.utcMs - lapsed.at.utcMs) / 1000).toBeCloseTo(0.5, 2);
      expect(watch.all('lost')).toEqual([]);
      expect((await watch.get('refused', { of: watch.move(0) })).code).toBe('not-renewed');
    });

    test('finishes a motion through noise that is shorter than the lease, and counts what was dropped', async () => {
      await begin();
      await watch.ready();
      const move = watch.move((await bench.trueAngleDeg()) > 0 ? -100 : 100);
      await watch.get('motion-began', { of: move });
      await bench.garbage(maker.noiseMs);
      const ended = await watch.get('motion-ended', { of: move });
      expect(ended.cause).toBe('done');
      expect(watch.all('lost')).toEqual([]);
      expect(watch.link.health().discardedLines).toBeGreaterThan(0);
    });

    test('is found again after its port disappeared in a motion, and the end of the motion is told with its own time', async () => {
      await begin();
      await watch.ready();
      const move = watch.move((await bench.trueAngleDeg()) > 0 ? -150 : 150);
      const began = await watch.get('motion-began', { of: move });
      await bench.unplug();
      expect((await watch.get('lost')).why).not.toBe('');
      await bench.pass(3_500);
      await bench.plug();
      const back = await watch.get('ready', { nth: 1, withinMs: 15_000 });
      expect(back.sameBoot).toBe(true);
      const ended = await watch.get('motion-ended', { of: move });
      // The lease of 2 s lapsed while nobody could hear; the stamp is the controller's.
      expect(ended.cause).toBe('lease');
      expect(ended.at.utcMs - began.at.utcMs).toBeLessThan(4_500);
      expect(ended.angleDeg).toBeCloseTo(await bench.trueAngleDeg(), 9);
      expect(watch.order('lost', 'lease-lapsed', 'motion-ended', 'ready')).toEqual([
        'ready',
        'lost',
        'lease-lapsed',
        'motion-ended',
        'ready',
      ]);
      expect(watch.link.health().reconnects).toBeGreaterThan(0);
    });

    test('is lost as soon as the lease must have lapsed when it falls silent in a motion', async () => {
      await begin();
      await watch.ready();
      const move = watch.move((await bench.trueAngleDeg()) > 0 ? -150 : 150);
      await watch.get('motion-began', { of: move });
      const silentFromMs = bench.clock.monotonicMs();
      await bench.drop(5_000);
      await watch.get('lost', { withinMs: 8_000 });
      // Sooner than the 5 s of a link at rest.
      expect(bench.clock.monotonicMs() - silentFromMs).toBeLessThan(4_800);
      const hold = watch.send((id) => ({ kind: 'hold', id }));
      await watch.get('standstill', { of: hold, withinMs: 15_000 });
      expect((await watch.get('motion-ended', { of: move })).cause).toBe('lease');
    });

    test('refuses a driver of an older epoch, in words', async () => {
      await begin();
      await watch.ready();
      await watch.link.close();
      watch = new LinkWatch(bench, 0);
      watch.link.open();
      expect((await watch.get('refused-controller')).why).toMatch(/Another server drives this controller \(its epoch is \d+\)/);
      expect(watch.link.health().condition).toBe('refused');
    });

    test('loses its position in a reset in motion, tells so, and refuses to move until homed', async () => {
      await begin();
      await watch.ready();
      const boot = watch.link.controller()?.bootId;
      const move = watch.move((await bench.trueAngleDeg()) > 0 ? -150 : 150);
      await watch.get('motion-began', { of: move });
      await bench.pass(600);
      await bench.reset();
      const reset = await watch.get('reset');
      expect(reset.bootId).not.toBe(boot);
      expect(await watch.get('motion-ended', { of: move })).toMatchObject({ cause: 'reset', angleDeg: null });
      const back = await watch.get('ready', { nth: 1 });
      expect(back).toMatchObject({ sameBoot: false, controller: { positionKnown: false, angleDeg: null, driversOn: false } });
      expect((await watch.get('refused', { of: watch.move(0) })).code).toBe('unknown');
    });

    test('another device that talks on the port is refused in words, and nothing of it is obeyed', async () => {
      await begin(maker.makeStranger('babble'));
      watch.link.open();
      const { why } = await watch.get('refused-controller', { withinMs: 15_000 });
      expect(why).toMatch(/^Something talks at .*, but not the controller's language: \d+ lines were dropped\./);
      expect(watch.link.health().condition).toBe('refused');
      expect((await watch.get('refused', { of: watch.move(1) })).code).toBe('no-session');
      await watch.link.close();
      const trial = await settled(tryLink({ factory: bench.factory, clock: bench.clock }));
      expect(trial).toMatchObject({ ok: false, firmware: null });
      expect(trial.detail).toContain('not the controller');
    });

    test('a controller of another major version is refused with both numbers', async () => {
      await begin(maker.makeStranger('other-major'));
      watch.link.open();
      const { why } = await watch.get('refused-controller', { withinMs: 15_000 });
      expect(why).toMatch(/speaks version 2\.0 of the line protocol, this server version 1\.0/);
      expect(watch.link.health().condition).toBe('refused');
    });

    /** Lets time pass until a promise is settled. */
    async function settled<T>(promise: Promise<T>): Promise<T> {
      let over = false;
      void promise.finally(() => {
        over = true;
      });
      await bench.until('the answer', () => over, 15_000);
      return promise;
    }
  });
}
