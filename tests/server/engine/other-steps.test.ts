import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument, RigMotion } from '@/shared/rig/document';
import { makeBench, runStart, sent, shortProtocol, startUtcMs, underWay } from './rig-bench';

describe('other steps', () => {
  const steps = (...list: ProtocolDocument['steps']): ProtocolDocument => ({
    formatVersion: 1,
    name: 'Steps',
    steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }, ...list],
  });

  test('settle lasts as long as it says', async () => {
    const bench = await underWay(200, runStart(steps({ kind: 'settle', for_s: 90, label: 'heat' }, { kind: 'swing', to: 'far' })));
    const [, , settled, swing] = bench.store.log();
    expect(settled).toMatchObject({ kind: 'settle', outcome: 'done', label: 'heat', station: 'near', good: null });
    expect((settled?.endUtcMs ?? 0) - (settled?.startUtcMs ?? 0)).toBeCloseTo(90_000, 6);
    expect(swing?.startUtcMs).toBe(settled?.endUtcMs);
  });

  // 22:00 UTC on 1 March is 23:00 in Oslo (UTC+1 in winter).
  test.each([
    { when: 'still to come: waited for', until: { localTime: '23:05' }, state: 'finished', waitedS: 300 },
    { when: 'past: gone on', until: { localTime: '22:00' }, state: 'finished', waitedS: 0 },
    { when: 'past and to be held', until: { localTime: '22:00', ifPast: 'hold' as const }, state: 'held', waitedS: 0 },
  ])('wait until a local time that is $when', async ({ until, state, waitedS }) => {
    const bench = await underWay(700, runStart(steps({ kind: 'wait', until }, { kind: 'swing', to: 'far' })));
    expect(bench.driver.facts().state).toBe(state);
    const wait = bench.store.log()[2];
    expect(wait?.outcome).toBe('done');
    expect((wait?.endUtcMs ?? 0) - startUtcMs).toBeCloseTo(waitedS === 0 ? (wait?.startUtcMs ?? 0) - startUtcMs : 1000 * waitedS, 6);
  });

  test('a repeat until a local time begins no pass that would end after it', async () => {
    const bench = await underWay(
      4000,
      runStart(
        steps({
          kind: 'repeat',
          until: { localTime: '23:10' },
          steps: [
            { kind: 'swing', to: 'far' },
            { kind: 'dwell', for_s: 60 },
            { kind: 'swing', to: 'near' },
            { kind: 'dwell', for_s: 60 },
          ],
        }),
      ),
    );
    expect(bench.driver.facts().state).toBe('finished');
    const last = bench.store.log().at(-1);
    expect(last?.endUtcMs).toBeLessThanOrEqual(startUtcMs + 600_000);
    expect(last?.path).toBe('3.repeat[4].4.dwell');
  });

  test('at the end the sources turn to the station asked for, and the drivers are released only if asked, where that is safe', async () => {
    const keep = await underWay(200, runStart({ ...shortProtocol, atEnd: { station: 'clear' } }));
    expect(keep.store.log().at(-1)).toMatchObject({ path: 'atEnd.swing', station: 'clear', outcome: 'done', angleEndDeg: 90 });
    expect(sent(keep, 'stop')).toEqual([]);
    const releasing: ProtocolDocument = { ...shortProtocol, atEnd: { drivers: 'release' } };
    const rig: RigDocument = { ...demoRigWide, motion: { ...(demoRigWide.motion as RigMotion), safeWhenFree: true } };
    const release = await underWay(200, runStart(releasing, { rig }));
    expect(sent(release, 'stop')).toEqual([expect.objectContaining({ releaseDrivers: true })]);
    expect(release.store.events.at(-1)).toMatchObject({ kind: 'finished', data: { drivers: 'release' } });
    const unsafe = await underWay(200, runStart(releasing));
    expect(sent(unsafe, 'stop')).toEqual([]);
    expect(unsafe.store.events.at(-1)?.data).toMatchObject({ drivers: 'keep', driversWhy: expect.stringContaining('safeWhenFree') });
  });

  test('of two stations at one angle the log names the one that was asked for', async () => {
    const bench = await underWay(
      200,
      runStart(steps({ kind: 'swing', to: 'across' }, { kind: 'dwell', for_s: 20 }, { kind: 'mark', label: 'x' })),
    );
    expect(
      bench.store
        .log()
        .slice(2)
        .map(({ station }) => station),
    ).toEqual(['across', 'across', 'across']);
  });

  test('a wait that was held still ends at its time of day', async () => {
    const bench = await underWay(60, runStart(steps({ kind: 'wait', until: { localTime: '23:05' } }, { kind: 'swing', to: 'far' })));
    bench.driver.hold('Ben');
    await bench.pass(100);
    await bench.driver.resume('Ben');
    const predicted = bench.driver.facts().predictedEndUtcMs ?? 0;
    expect(predicted).toBeGreaterThan(startUtcMs + 300_000);
    expect(predicted).toBeLessThan(startUtcMs + 320_000);
    await bench.pass(400);
    expect(
      bench.store
        .log()
        .slice(2)
        .map(({ kind, outcome }) => `${kind} ${outcome}`),
    ).toEqual(['wait cut short', 'wait done', 'swing done']);
    expect(bench.store.log()[3]?.endUtcMs).toBe(startUtcMs + 300_000);
  });

  test('a protocol that begins to swing without a known position fails with what to do', async () => {
    const bench = makeBench(runStart({ ...shortProtocol, steps: [{ kind: 'swing', to: 'near' }] }));
    bench.link.angleDeg = null;
    bench.driver.start();
    await bench.pass(5);
    expect(bench.driver.facts()).toMatchObject({
      state: 'failed',
      reason: 'Step 1.swing: the position of the turntable is not known. Begin the protocol with a home step.',
    });
  });

  test('a move that would leave the limits is not sent, whatever was checked before', async () => {
    const bench = await underWay(60, runStart(steps({ kind: 'swing', to: { angle_deg: 300 } })));
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: expect.stringContaining('motion.maxDeg') });
    expect(bench.link.motions).toHaveLength(2);
  });
});
