import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { verifyChain } from '@/shared/archive/chain';
import { readArchive } from '@/shared/archive/read-archive';
import { evaluateArchive } from '@/shared/evaluation/evaluate-archive';
import { CODATA_2022_G } from '@/shared/physics/constants';
import type { InterruptionPolicy, ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument, RigMotion } from '@/shared/rig/document';
import { main } from '@/server/boot/rehearse';
import { rehearsalParts } from '@/server/boot/rehearsal-parts';
import { type Rehearsal, rehearse } from '@/server/engine/rehearsal/rehearse';
import { readArchiveFiles } from '@/server/evaluation/archive-files';
import { sha256Hex } from '@/server/evaluation/sha256';
import { rehearsalStart, startUtcMs } from './rehearsing';

/** Rotations through the engine, the link and the codec on the simulated controller, whose flag covers half of each turn. */

const rig: RigDocument = { ...demoRigWide, motion: { ...(demoRigWide.motion as RigMotion), turnsLimit: 4 } };
delete rig.noise;
const protocol = (turns: number, period_s: number): ProtocolDocument => ({
  formatVersion: 1,
  name: 'Turning',
  steps: [{ kind: 'home' }, { kind: 'rotate', period_s, turns }, { kind: 'dwell', for_s: 30 }],
});
const run = (document: ProtocolDocument, faults: { kind: string; atS: number }[] = []): Promise<Rehearsal> =>
  rehearse({ start: { ...rehearsalStart(document, { faults }), rig }, startUtcMs }, rehearsalParts());
const rowsOf = ({ steps }: Rehearsal) => steps.map(({ path, outcome }) => `${path} ${outcome}`);
const eventsOf = ({ events }: Rehearsal, kind: string) => events.filter((event) => event.kind === kind).map(({ data }) => data);

test.each([2, -2])(
  '%d turns there and back: every pass of the edge proves the count, the other end of the flag is told apart',
  async (turns) => {
    const whole = await run(protocol(turns, 90));
    expect(whole.outcome).toBe('finished');
    expect(rowsOf(whole)).toEqual(['1.home done', '2.rotate.a done', '2.rotate.b done', '3.dwell done']);
    const [, out, back] = whole.steps;
    expect(out?.angleEndDeg).toBeCloseTo(360 * turns, 9);
    expect(back?.angleEndDeg).toBeCloseTo(0, 9);
    // The plan takes the speed as the link writes it; what is left is the controller's clock, 18 ppm of 182 s.
    const tookMs = (out?.endUtcMs ?? 0) - (out?.startUtcMs ?? 0);
    const plannedMs = (out?.plannedEndUtcMs ?? 0) - (out?.plannedStartUtcMs ?? 0);
    expect(Math.abs(tookMs - plannedMs)).toBeLessThan(5);
    const rotating = { from: out?.startUtcMs ?? 0, to: back?.endUtcMs ?? 0 };
    const within = whole.events.filter(({ at }) => Date.parse(at) >= rotating.from && Date.parse(at) <= rotating.to);
    const passes = within.filter(({ kind }) => kind === 'home-edge');
    expect(passes.length).toBeGreaterThanOrEqual(3);
    expect(passes.every(({ data }) => data['proved'] === true && data['slipSteps'] === 0)).toBe(true);
    expect(within.filter(({ kind }) => kind === 'flag-end')).toHaveLength(4);
    expect(out?.angleSource).toBe('edge-verified');
  },
);

const policies: InterruptionPolicy[] = ['hold', 'resume', 'stop'];
const ends: Record<string, Record<InterruptionPolicy, string>> = {
  'link-drop': { hold: 'held', resume: 'finished', stop: 'stopped' },
  garbage: { hold: 'finished', resume: 'finished', stop: 'finished' },
  'server-kill': { hold: 'held', resume: 'finished', stop: 'stopped' },
  'controller-reset': { hold: 'held', resume: 'held', stop: 'stopped' },
  'interlock-open': { hold: 'held', resume: 'held', stop: 'stopped' },
};
const cells = Object.keys(ends).flatMap((kind) => policies.map((policy) => ({ kind, policy, outcome: ends[kind]?.[policy] ?? '' })));

test.each(cells)('$kind in a rotation under $policy: $outcome', async ({ kind, policy, outcome }) => {
  // On the way out, about the turning point at 184.2 s, and on the way back.
  for (const atS of [2.2, 100, 183.5, 184.6, 250]) {
    const result = await run({ ...protocol(2, 90), onInterruption: policy }, [{ kind, atS }]);
    expect({ atS, outcome: result.outcome, reason: result.facts.reason }).toMatchObject({ atS, outcome });
    expect(result.steps.filter((row) => row.outcome === null || row.endUtcMs === null)).toEqual([]);
    expect(verifyChain(result.events, sha256Hex)).toMatchObject({ valid: true });
    if (outcome === 'finished') expect(result.steps.at(-1)?.angleStartDeg).toBeCloseTo(0, 6);
    else expect(eventsOf(result, 'rotation-broken-off')).toHaveLength(1);
  }
});

describe('the commands', () => {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-rotation-'));
  afterAll(() => rmSync(folder, { recursive: true }));
  let count = 0;
  async function rehearsed(document: ProtocolDocument, more: string[] = [], on: RigDocument = rig) {
    count += 1;
    const at = (name: string) => join(folder, `${name}-${count}`);
    writeFileSync(at('protocol'), JSON.stringify(document));
    writeFileSync(at('rig'), JSON.stringify(on));
    let told = '';
    const tell = { out: (text: string) => void (told += text), err: (text: string) => void (told += text) };
    const code = await main([at('protocol'), '--rig', at('rig'), '--out', at('night'), ...more], tell);
    return { code, told, out: at('night') };
  }

  test('a rehearsed rotation gives the G that the pendulum was made with, by the modulation method', async () => {
    const document = { ...protocol(4, 1800), evaluation: { method: 'modulation' } } as ProtocolDocument;
    const { code, told, out } = await rehearsed(document, ['--rate', '2']);
    expect({ code, told }).toEqual({ code: 0, told: expect.stringContaining('"outcome":"finished"') });
    const { result } = evaluateArchive(readArchive(readArchiveFiles(out), sha256Hex), {});
    expect(result.method).toBe('modulation');
    // The truth the rehearsal was made with: CODATA 2022.
    expect(Math.abs((result.G?.value ?? NaN) / CODATA_2022_G.value - 1)).toBeLessThan(1e-4);
  }, 120_000);

  test('a rotation whose server died in mid-turn goes on, keeps the instant at which it began, and gives the same G', async () => {
    const steps = [{ kind: 'home' }, { kind: 'rotate', period_s: 1800, turns: 4 }, { kind: 'rotate', period_s: 1800, turns: -2 }];
    const document = { ...protocol(4, 1800), steps, onInterruption: 'resume', evaluation: { method: 'modulation' } } as ProtocolDocument;
    const { code, told, out } = await rehearsed(document, ['--rate', '2', '--fault', 'server-kill@3000']);
    expect({ code, told }).toEqual({ code: 0, told: expect.stringContaining('"outcome":"finished"') });
    const archive = readArchive(readArchiveFiles(out), sha256Hex);
    const [broken, late] = archive.steps.filter(({ path }) => path === '2.rotate.a');
    expect([broken?.outcome, late?.outcome]).toEqual(['cut short', 'late']);
    // Not what the next server makes of it, which has only just met the controller's clock.
    expect(broken?.uStartS).toBeLessThan(0.001);
    const { G } = evaluateArchive(archive, {}).result;
    expect(Math.abs((G?.value ?? NaN) / CODATA_2022_G.value - 1)).toBeLessThan(1e-4);
  }, 120_000);

  test('the reference firmware turns it just so', async () => {
    const { code, told, out } = await rehearsed(protocol(1, 66), ['--board']);
    expect({ code, told }).toEqual({ code: 0, told: expect.stringContaining('"outcome":"finished"') });
    const steps = readFileSync(join(out, 'steps.csv'), 'utf8');
    expect(steps).toContain('2.rotate.a,');
    expect(steps).toContain('2.rotate.b,');
    const events = readFileSync(join(out, 'events.jsonl'), 'utf8');
    expect(events.match(/"flag-end"/g)).toHaveLength(2);
    expect(events).not.toContain('table-slipped');
  }, 120_000);

  test('a rotation on a rig that is not free to turn is refused with what would be right', async () => {
    const arcs = { ...rig, motion: { ...(rig.motion as RigMotion), keepOut: [[40, 60]] as [number, number][] } };
    expect(await rehearsed(protocol(2, 90), [], demoRigWide)).toMatchObject({
      code: 2,
      told: expect.stringContaining('motion.turnsLimit 0'),
    });
    expect(await rehearsed(protocol(2, 90), [], arcs)).toMatchObject({ code: 2, told: expect.stringContaining('keep-out arc 40° to 60°') });
    expect(await rehearsed(protocol(5, 90))).toMatchObject({ code: 2, told: expect.stringContaining('up to 4 either way') });
  });
});
