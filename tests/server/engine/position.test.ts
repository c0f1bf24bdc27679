import { demoRigWide } from '@/shared/rig/demo-rigs';
import { slipToleranceDeg } from '@/shared/rig/position-proof';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { type Bench, brief, makeBench, runStart, sent, shortProtocol, underWay } from './rig-bench';

const stepDeg = 360 / 16_000;
const eventOf = (bench: Bench, kind: string) => bench.store.events.findLast((event) => event.kind === kind)?.data;
const protocol = (...steps: Step[]): ProtocolDocument => ({ ...shortProtocol, steps });
const row = (bench: Bench, path: string) => bench.store.log().find((one) => one.path === path);

/** Near from 0.4 s to 13.5 s, dwell to 73.5 s, then the swing to far passes the edge at about 80 s. */
const inSwing = (more: Parameters<typeof runStart>[1] = {}) => underWay(72, runStart(shortProtocol, more));

describe('each pass of the home edge proves the count', () => {
  test('a pass within the tolerance is logged, and the swing and the dwell after it are proved', async () => {
    const bench = await inSwing();
    bench.link.edge(-stepDeg, 'cw');
    await bench.pass(100);
    expect(eventOf(bench, 'home-edge')).toMatchObject({ angleDeg: -stepDeg, direction: 'cw', slipSteps: 0, proved: true });
    expect(row(bench, '5.swing')).toMatchObject({ angleSource: 'edge-verified', outcome: 'done' });
    expect(row(bench, '6.dwell')).toMatchObject({ angleSource: 'edge-verified', outcome: 'done' });
    expect(bench.driver.facts().state).toBe('finished');
  });

  test('homing proves the first swing; without a pass the one after it is counted, less surely', async () => {
    const bench = await underWay(200);
    expect(row(bench, '2.swing')).toMatchObject({ angleSource: 'edge-verified' });
    expect(row(bench, '5.swing')).toMatchObject({ angleSource: 'counted' });
    expect(row(bench, '6.dwell')?.uAngleDeg).toBeCloseTo(
      Math.hypot(row(bench, '3.dwell')?.uAngleDeg ?? 0, slipToleranceDeg(demoRigWide) / Math.sqrt(3)),
      12,
    );
  });

  test('a pass while the position is not known is logged and proves nothing', async () => {
    const bench = await inSwing();
    bench.link.edge(null, 'cw');
    await bench.pass(1);
    expect(eventOf(bench, 'home-edge')).toEqual({ angleDeg: null, direction: 'cw' });
    expect(bench.driver.facts().state).toBe('running');
  });
});

describe('a table that slips', () => {
  const slipped = async (more: Parameters<typeof runStart>[1] = {}) => {
    const bench = await inSwing(more);
    bench.link.edge(-41 * stepDeg, 'cw');
    await bench.pass(5);
    return bench;
  };

  test.each(['hold', 'resume', 'stop'] as const)('holds the run in mid-swing, never carried on by itself (%s)', async (onInterruption) => {
    const bench = await underWay(72, runStart({ ...shortProtocol, onInterruption }));
    bench.link.edge(-41 * stepDeg, 'cw');
    await bench.pass(700);
    expect(bench.driver.facts()).toMatchObject({
      state: 'held',
      reason: expect.stringContaining('The table slipped by 40 microsteps (0.90°)'),
    });
    expect(brief(bench).slice(-2)).toEqual(['mark done', 'swing cut short']);
    expect(sent(bench, 'hold')).toHaveLength(1);
    expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'notify', topic: 'held' }));
  });

  test('the dwells since the last good pass are marked in the step log and named in the chain', async () => {
    const bench = await slipped();
    const dwell = row(bench, '3.dwell');
    expect(dwell).toMatchObject({ angleSource: 'counted', outcome: 'done', good: true });
    expect(dwell?.uAngleDeg).toBeGreaterThan(0.9 / Math.sqrt(3));
    expect(eventOf(bench, 'table-slipped')).toMatchObject({
      slipSteps: -40,
      slipDeg: expect.closeTo(-0.9, 9),
      direction: 'cw',
      dwells: [dwell?.seq],
    });
    expect(row(bench, '5.swing')).toMatchObject({ angleSource: 'counted' });
  });

  test('dwells before the last good pass stay proved', async () => {
    const bench = await underWay(
      72,
      runStart(
        protocol(
          { kind: 'home' },
          { kind: 'swing', to: 'near' },
          { kind: 'dwell', for_s: 60 },
          { kind: 'swing', to: 'far' },
          { kind: 'dwell', for_s: 60 },
          { kind: 'swing', to: 'near' },
          { kind: 'dwell', for_s: 60 },
        ),
      ),
    );
    bench.link.edge(-stepDeg, 'cw');
    await bench.pass(72);
    bench.link.edge(64 * stepDeg, 'ccw');
    await bench.pass(5);
    expect(row(bench, '3.dwell')).toMatchObject({ angleSource: 'edge-verified' });
    expect(row(bench, '5.dwell')).toMatchObject({ angleSource: 'counted' });
    expect(bench.driver.facts().state).toBe('held');
  });

  test('the run cannot be resumed on a wrong count, and says what to do', async () => {
    const bench = await slipped();
    expect(await bench.driver.resume('Cleo')).toEqual({ ok: false, why: expect.stringContaining('home the rig in a new run') });
    expect(bench.driver.facts().mayResume.ok).toBe(false);
    const { length } = bench.link.motions;
    await bench.pass(300);
    expect(bench.link.motions).toHaveLength(length);
  });

  test('a restart of the server forgets nothing of it', async () => {
    const bench = await slipped();
    await bench.restart(5);
    await bench.pass(5);
    expect(bench.driver.facts().mayResume.why).toContain('The table has slipped');
  });

  test('somebody who turns the table by hand in a dwell marks that dwell', async () => {
    const bench = await underWay(30);
    bench.link.edge(20.18, 'cw');
    await bench.pass(5);
    expect(bench.driver.facts().state).toBe('held');
    expect(row(bench, '3.dwell')).toMatchObject({ angleSource: 'counted', outcome: 'cut short' });
  });

  test('who stopped a run stays its reason; the slip stands in the log', async () => {
    const bench = await inSwing();
    bench.driver.stop('Ben');
    bench.link.edge(-41 * stepDeg, 'cw');
    await bench.pass(5);
    expect(bench.driver.facts()).toMatchObject({ state: 'stopped', reason: 'Ben stopped the run.' });
    expect(eventOf(bench, 'table-slipped')).toBeDefined();
  });
});

describe('a home edge that is not where it was', () => {
  const homing = async (offDeg: number) => {
    const bench = makeBench(runStart(protocol({ kind: 'home' }, { kind: 'swing', to: 'near' })));
    bench.link.angleDeg = 5;
    bench.driver.start();
    await bench.pass(3);
    bench.link.edge(offDeg + 0.3, 'cw');
    bench.link.edge(offDeg, 'ccw');
    await bench.pass(20);
    return bench;
  };

  test('is an alarm and a hold when the homing is over; a person may resume, for the count is right again', async () => {
    const bench = await homing(0.45);
    expect(bench.driver.facts()).toMatchObject({
      state: 'held',
      reason: expect.stringContaining('The table slipped by 20 microsteps (0.45°) before it was homed.'),
    });
    expect(eventOf(bench, 'table-slipped')).toMatchObject({ slipSteps: 20, found: 'home' });
    expect(row(bench, '1.home')).toMatchObject({ outcome: 'done', angleSource: 'edge-verified' });
    expect(bench.link.motions).toHaveLength(1);
    expect(await bench.driver.resume('Cleo')).toMatchObject({ ok: true });
    await bench.pass(30);
    expect(row(bench, '2.swing')).toMatchObject({ outcome: 'done', angleSource: 'edge-verified' });
  });

  test('within the tolerance the run goes on', async () => {
    const bench = await homing(0.0225);
    await bench.pass(20);
    expect(bench.driver.facts().state).toBe('finished');
  });
});
