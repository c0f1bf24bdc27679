import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { type Bench, makeBench, runStart, sent, shortProtocol, startUtcMs, underWay } from './rig-bench';

const withMotion = (rig: RigDocument, motion: Partial<NonNullable<RigDocument['motion']>>): RigDocument => ({
  ...rig,
  motion: { ...(rig.motion as NonNullable<RigDocument['motion']>), ...motion },
});
const protocol = (...steps: Step[]): ProtocolDocument => ({ ...shortProtocol, steps });

describe('the position is lost after reset, supply loss or driver release, always', () => {
  const fine = { name: 'Ada Quill', untilUtcMs: startUtcMs + 16 * 3_600_000 };

  test.each<[string, (bench: Bench) => void]>([
    ['reset', (bench) => bench.link.reset()],
    [
      'supply loss',
      (bench) => {
        bench.link.loseSupply();
        bench.link.returnSupply();
      },
    ],
  ])('%s: the arm is void and no arm makes the run go on', async (_what, lose) => {
    const bench = await underWay(30);
    lose(bench);
    await bench.pass(5);
    expect(bench.driver.facts().state).toBe('held');
    expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'void-arm' }));
    bench.arm.now = { ...fine, name: 'Ben Frost' };
    expect(await bench.driver.resume('Cleo')).toMatchObject({ ok: false, why: expect.stringContaining('home the rig in a new run') });
  });

  test.each<[string, (bench: Bench) => void]>([
    ['reset', (bench) => bench.link.reset()],
    [
      'supply loss',
      (bench) => {
        bench.link.loseSupply();
        bench.link.returnSupply();
      },
    ],
  ])('%s while homing: homing goes on only by a person with a new arm', async (_what, lose) => {
    const bench = makeBench(runStart(protocol({ kind: 'home' }, { kind: 'dwell', for_s: 10 })));
    bench.link.angleDeg = 5;
    bench.driver.start();
    await bench.pass(3);
    lose(bench);
    bench.arm.now = null;
    await bench.pass(5);
    expect(bench.driver.facts()).toMatchObject({ state: 'held', mayResume: { ok: false, why: expect.stringContaining('not armed') } });
    await bench.pass(600);
    expect(sent(bench, 'home')).toHaveLength(1);
    bench.arm.now = { ...fine, name: 'Ben Frost' };
    expect(await bench.driver.resume('Ben Frost')).toMatchObject({ ok: true });
    await bench.pass(60);
    expect(bench.driver.facts().state).toBe('finished');
  });

  test('drivers that are released at the end of a run end the arm with it', async () => {
    const rig = withMotion(demoRigWide, { safeWhenFree: true });
    const released: ProtocolDocument = { ...shortProtocol, atEnd: { drivers: 'release' } };
    const bench = await underWay(300, runStart(released, { rig }));
    expect(bench.driver.facts().state).toBe('finished');
    expect(bench.link.controller()).toMatchObject({ positionKnown: false });
    expect(bench.performed).toContainEqual(expect.objectContaining({ kind: 'void-arm', reason: expect.stringContaining('released') }));
  });

  test('drivers that stay on leave the arm', async () => {
    const bench = await underWay(300);
    expect(bench.driver.facts().state).toBe('finished');
    expect(bench.performed.filter(({ kind }) => kind === 'void-arm')).toEqual([]);
  });
});

describe('homing by itself', () => {
  const start = (rig: RigDocument) => runStart(protocol({ kind: 'home' }), { rig });
  const lost = async (rig: RigDocument, prepare: (bench: Bench) => void = () => undefined) => {
    const bench = makeBench(start(rig));
    bench.link.angleDeg = null;
    prepare(bench);
    bench.driver.start();
    await bench.pass(60);
    return bench;
  };

  test('is refused beside keep-out arcs when the edge does not lie between near and far', async () => {
    const bench = await lost(withMotion(demoRigNarrow, { homeDeg: 31 }));
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: expect.stringContaining('does not home by itself') });
    expect(sent(bench, 'home', 'move')).toEqual([]);
  });

  test('is refused when a keep-out arc lies within the travel', async () => {
    const bench = await lost(withMotion(demoRigWide, { keepOut: [[100, 110]] }));
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: expect.stringContaining('keep-out arc 100° to 110°') });
    expect(sent(bench, 'home', 'move')).toEqual([]);
  });

  test('is refused by a controller without a home flag, and the run says so', async () => {
    const bench = await lost(demoRigNarrow, ({ link }) => {
      link.refuseNext = { code: 'flag', message: 'this controller has no home flag' };
    });
    expect(bench.driver.facts()).toMatchObject({ state: 'failed', reason: expect.stringContaining('no home flag') });
    expect(bench.link.motions).toEqual([]);
  });

  test('is done where the edge is in the middle', async () => {
    const bench = await lost(demoRigNarrow);
    expect(sent(bench, 'home')).toHaveLength(1);
  });
});
