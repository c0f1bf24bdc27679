import * as fc from 'fast-check';
import { verifyChain } from '@/shared/archive/chain';
import type { InterruptionPolicy } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { rehearsalParts } from '@/server/boot/rehearsal-parts';
import { RehearsalStore } from '@/server/engine/rehearsal/rehearsal-store';
import { MemoryJournal } from '@/server/engine/memory-journal';
import { RunDriver } from '@/server/engine/run-driver';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { sha256Hex } from '@/server/evaluation/sha256';
import type { RigMotion } from '@/shared/rig/document';
import { rehearsalStart, shortProtocol, startUtcMs } from './rehearsing';

/** People hold, resume and stop at any moment, on the real link; the simulated turntable itself is the witness. */

async function makeNight(onInterruption: InterruptionPolicy) {
  const start = rehearsalStart({ ...shortProtocol, onInterruption });
  const parts = rehearsalParts();
  const clock = new VirtualClock(startUtcMs - 3000, parts.settle);
  const motion = demoRigWide.motion as RigMotion;
  const controller = parts.createController({ clock, rig: motion, seed: 1 });
  const link = parts.createLink({ factory: controller.factory, clock, rig: motion, epoch: 1 });
  link.open();
  await clock.advance(3000);
  const store = new RehearsalStore(start);
  const driver = new RunDriver({
    start,
    stored: null,
    store,
    journal: new MemoryJournal(),
    link,
    clock,
    sha256: sha256Hex,
    armNow: () => null,
    perform: () => undefined,
  });
  driver.start();
  const angleDeg = () => controller.trueAngleDegAt(clock.utcMs());
  return { clock, controller, link, store, driver, angleDeg, pass: (seconds: number) => clock.advance(1000 * seconds) };
}
type Night = Awaited<ReturnType<typeof makeNight>>;

/** From 6 deg/s at 2 deg/s2 the table stands after 3 s; bytes, answers and events take some hundredths of a second more. */
const BRAKING_S = 3.2;

async function expectStandstill({ angleDeg, pass }: Night, forS: number): Promise<void> {
  const stoodAt = angleDeg();
  for (let i = 0; i < 10; i += 1) {
    await pass(forS / 10);
    expect(angleDeg()).toBe(stoodAt);
  }
}

const moments = [0.4, 1, 3, 8, 20, 47, 48.5, 52, 57, 100];

test.each(moments)('hold at %s s: at rest within the ramp, confirmed by the controller, whole after resume', async (seconds) => {
  const night = await makeNight('hold');
  await night.pass(seconds);
  night.driver.hold('Ben');
  await night.pass(BRAKING_S);
  const { state, intervention } = night.driver.facts();
  expect(state).toBe('held');
  expect(intervention?.confirmedAtUtcMs).toBeGreaterThan(startUtcMs + 1000 * seconds);
  expect(intervention?.confirmedAtUtcMs).toBeLessThan(startUtcMs + 1000 * (seconds + BRAKING_S));
  await expectStandstill(night, 300);
  expect(await night.driver.resume('Ben')).toMatchObject({ ok: true });
  await night.pass(400);
  expect(night.driver.facts().state).toBe('finished');
  const dwells = night.store.steps().filter(({ kind, outcome }) => kind === 'dwell' && outcome === 'done');
  expect(dwells.map(({ station }) => station)).toEqual(['near', 'far', 'near', 'far', 'near']);
  for (const { startUtcMs: from, endUtcMs: to } of dwells) expect((to ?? 0) - from).toBeCloseTo(40_000, 3);
});

test.each(moments)('stop at %s s: at rest within the ramp, and nothing moves again', async (seconds) => {
  const night = await makeNight('resume');
  await night.pass(seconds);
  night.driver.stop('Ben');
  await night.pass(BRAKING_S);
  expect(night.driver.facts()).toMatchObject({ state: 'stopped', reason: 'Ben stopped the run.' });
  await expectStandstill(night, 1000);
});

type Tap =
  { kind: 'pass'; seconds: number } | { kind: 'hold' | 'resume' | 'hold-after-dwell' | 'end-early' | 'go-on' | 'drop' | 'garbage' };
const tap: fc.Arbitrary<Tap> = fc.oneof(
  { weight: 3, arbitrary: fc.record({ kind: fc.constant('pass' as const), seconds: fc.double({ min: 0.001, max: 45, noNaN: true }) }) },
  {
    weight: 3,
    arbitrary: fc.record({
      kind: fc.constantFrom(...(['hold', 'resume', 'hold-after-dwell', 'end-early', 'go-on', 'drop', 'garbage'] as const)),
    }),
  },
);

async function doTap(night: Night, what: Tap): Promise<void> {
  const { driver, controller, pass } = night;
  if (what.kind === 'pass') return void (await pass(what.seconds));
  if (what.kind === 'hold') return void driver.hold('Ben');
  if (what.kind === 'resume') return void driver.resume('Ben');
  if (what.kind === 'hold-after-dwell') return void driver.holdAfterDwell('Ben');
  if (what.kind === 'end-early') return void driver.requests.finishEarly('Cleo');
  if (what.kind === 'go-on') return void driver.requests.withdrawFinish('Cleo');
  if (what.kind === 'drop') return controller.dropLine(30_000);
  controller.garbage(1000);
}

test('taps and line faults in any order: held means standing still, the log is whole, and the run can be stopped', async () => {
  await fc.assert(
    fc.asyncProperty(
      fc.constantFrom<InterruptionPolicy>('hold', 'resume', 'stop'),
      fc.array(tap, { minLength: 1, maxLength: 20 }),
      async (onInterruption, taps) => {
        const night = await makeNight(onInterruption);
        for (const what of taps) await doTap(night, what);
        await night.pass(60);
        if (night.driver.facts().state === 'held') await expectStandstill(night, 60);
        night.driver.stop('Ben');
        await night.pass(100);
        expect(['stopped', 'finished', 'failed']).toContain(night.driver.facts().state);
        await expectStandstill(night, 60);
        const steps = night.store.steps();
        expect(steps.map(({ seq }) => seq)).toEqual(steps.map((_, index) => index + 1));
        expect(steps.filter(({ outcome, endUtcMs, startUtcMs: from }) => outcome === null || endUtcMs === null || endUtcMs < from)).toEqual(
          [],
        );
        expect(night.driver.facts().state).not.toBe('failed');
        expect(verifyChain(night.store.events, sha256Hex)).toMatchObject({ valid: true });
        await night.link.close();
      },
    ),
    { numRuns: 60 },
  );
}, 60_000);
