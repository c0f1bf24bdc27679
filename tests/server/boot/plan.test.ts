import { execFileSync, spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { main } from '@/server/boot/plan';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

let folder: string;
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'evenfall-plan-'));
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** Writes a file of the test and gives its path. */
function file(name: string, content: unknown): string {
  const path = join(folder, name);
  writeFileSync(path, typeof content === 'string' ? content : JSON.stringify(content));
  return path;
}

function plan(...args: string[]) {
  const [out, err] = [[] as string[], [] as string[]];
  const code = main(args, { out: (text) => out.push(text), err: (text) => err.push(text) });
  const stdout = out.join('');
  return { code, stdout, stderr: err.join(''), plan: code === 0 ? (JSON.parse(stdout) as Record<string, unknown>) : null };
}

const protocol = (steps: Step[], more: Partial<ProtocolDocument> = {}): ProtocolDocument => ({
  formatVersion: 1,
  name: 'Test',
  steps,
  ...more,
});
const pairs = (dwell: Step): ProtocolDocument =>
  protocol([
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'repeat', times: 6, steps: [{ kind: 'swing', to: 'far' }, dwell, { kind: 'swing', to: 'near' }, dwell] },
  ]);

test('a template: all the keys of the format', () => {
  const { code, plan: result, stderr } = plan('--template', 'near-far-short');
  expect({ code, stderr }).toEqual({ code: 0, stderr: '' });
  expect(Object.keys(result ?? {}).sort()).toEqual([
    'advice',
    'alternatives',
    'bestDwell_s',
    'duration_s',
    'peakExcursion_rad',
    'relativeU',
    'signal_m',
    'signal_rad',
    'signal_u_m',
    'signal_u_rad',
    'u_by_source',
  ]);
  expect(result?.['advice']).toEqual([]);
  // 0.38 % of the orbit and 0.11 % of the arm (design reference F4) beside 0.04 % of noise.
  expect(result?.['relativeU']).toBeCloseTo(0.00399, 4);
  expect(result?.['u_by_source']).toMatchObject({ 'sources.orbit': expect.closeTo(0.0037719, 5) as number });
  // With a kick to tell period and decay one period from swing to swing is best (design reference J2).
  expect(result?.['bestDwell_s']).toBeCloseTo(420 - 9.727, 2);
  // After the kick it swings by 2 mrad about 1.187 mrad, and half a period later still by K = 0.82 of it (design reference A4, A8).
  expect(result?.['peakExcursion_rad']).toBeGreaterThan(0.001187 + 0.82 * 0.002);
  expect(result?.['peakExcursion_rad']).toBeLessThan(0.001187 + 0.002);
  expect((result?.['alternatives'] as unknown[]).length).toBeGreaterThanOrEqual(2);
  // Twelve beats of 840 s, a move of 20.18 deg (20.18 / 6 + 3 s), a homing from the home position that takes a second or two, and a kick: half a
  // period, the rest of two moves of some seconds, and three periods of ring-down.
  expect(result?.['duration_s']).toBeGreaterThan(10_086.36 + 3.5 * 420);
  expect(result?.['duration_s']).toBeLessThan(10_089 + 3.5 * 420 + 10);
  // 2.3738257e-3 rad at the greatest torque of rig W (design reference A4), which is flat there; the spot moves 4 × 5 m times as far.
  expect(((result?.['signal_rad'] as number) / 0.002373825686861 - 1) ** 2).toBeLessThan(1e-12);
  // The orbit leaves 0.38 % of it open, the arm 0.11 %, period and decay little.
  expect((result?.['signal_u_rad'] as number) / 0.002373825686861).toBeCloseTo(0.004, 3);
  expect(((result?.['signal_m'] as number) / (20 * 0.002373825686861) - 0.5) ** 2).toBeLessThan(1e-8);
});

test('a file on another rig', () => {
  const { plan: result } = plan(file('protocol.json', pairs({ kind: 'dwell', for_s: 620 })), '--rig', file('rig.json', demoRigNarrow));
  // 5.3696 mrad and 53.697 mm on rig N (design reference A4, A5); near to far takes 22.13 s there, so the beat is 642 s, 1.53 periods.
  expect(result?.['signal_rad']).toBeCloseTo(0.0053696, 6);
  expect(result?.['signal_m']).toBeCloseTo(0.053697, 5);
  expect(result?.['advice']).toEqual([
    { code: 'cycle-pumps', path: '3.repeat.2.dwell', message: expect.stringContaining('1.53 periods') as string },
    { code: 'cycle-pumps', path: '3.repeat.4.dwell', message: expect.any(String) as string },
    { code: 'geometry-decides', path: null, message: expect.stringContaining('sources.orbit') as string },
  ]);
});

test('a method whose u is not planned has none, and says so: never that of another method', () => {
  const dwells = pairs({ kind: 'dwell', beat_periods: 2 });
  expect(plan(file('equilibria.json', dwells)).plan?.['relativeU']).toBeGreaterThan(0);
  const { plan: result } = plan(file('turns.json', { ...dwells, evaluation: { method: 'modulation' } }));
  expect(result).toMatchObject({ relativeU: null, u_by_source: null });
  expect(result?.['advice']).toContainEqual({
    code: 'u-not-planned',
    path: 'evaluation.method',
    message: expect.stringContaining('No u of G by the turns') as string,
  });
});

test('the empty control has the spheres taken off', () => {
  expect(plan('--template', 'empty-control').plan?.['signal_rad']).toBeCloseTo(0, 15);
});

test('a protocol without a home step starts homed, at the home position', () => {
  const { plan: result } = plan(
    file(
      'no-home.json',
      protocol([
        { kind: 'swing', to: 'clear' },
        { kind: 'dwell', for_s: 582 },
      ]),
    ),
  );
  expect(result?.['duration_s']).toBeCloseTo(600, 6);
});

test('what the rig does not tell is null', () => {
  const steps: Step[] = [{ kind: 'home' }, { kind: 'swing', to: 'near' }, { kind: 'dwell', for_s: 600 }];
  const unmeasured = { ...demoRigWide, measured: undefined };
  expect(plan(file('short.json', protocol(steps)), '--rig', file('unmeasured.json', unmeasured)).plan).toMatchObject({
    signal_rad: null,
    signal_u_rad: null,
    signal_m: null,
    signal_u_m: null,
    relativeU: null,
    u_by_source: null,
    bestDwell_s: null,
    peakExcursion_rad: null,
    alternatives: [],
  });
});

describe('unusable input ends with 2, nothing on stdout and the reason on stderr', () => {
  const twoRigs: RigDocument = {
    ...demoRigWide,
    motion: { ...(demoRigWide.motion as NonNullable<RigDocument['motion']>), keepOut: [[40, 60]] },
  };
  test.each<[string, () => string[], string]>([
    ['nothing given', () => [], 'No protocol was given'],
    ['file and template', () => [file('a.json', pairs({ kind: 'dwell', for_s: 600 })), '--template', 'still'], 'one of the two'],
    ['an unknown option', () => ['--template', 'still', '--speed', '9'], '--speed'],
    ['an unknown template', () => ['--template', 'nearfar'], 'near-far-short'],
    ['a file that is not there', () => [join(folder, 'missing.json')], 'missing.json cannot be read'],
    ['a file that is no JSON', () => [file('b.json', '{"formatVersion": 1,\n "name": }')], 'Line 2, column 10'],
    [
      'a protocol that does not fit the format',
      () => [file('c.json', { formatVersion: 1, name: 'x', steps: [{ kind: 'dwell' }] })],
      '1.dwell: A dwell: exactly one of',
    ],
    ['an empty protocol', () => [file('d.json', protocol([]))], 'no steps'],
    [
      'an unknown station',
      () => [file('e.json', protocol([{ kind: 'home' }, { kind: 'swing', to: 'nearby' }]))],
      '2.swing: The rig has no station "nearby"',
    ],
    [
      'a path through a keep-out arc',
      () => [file('f.json', protocol([{ kind: 'home' }, { kind: 'swing', to: 'clear' }])), '--rig', file('arc.json', twoRigs)],
      'keep-out arc 40° to 60°',
    ],
    [
      'a rig that does not fit its format',
      () => ['--template', 'still', '--rig', file('r.json', { ...demoRigWide, stations: { near: { value: 20, u: 0.05, unit: 'rad' } } })],
      'stations.near.unit',
    ],
  ])('%s', (_, args, words) => {
    const { code, stdout, stderr } = plan(...args());
    expect({ code, stdout }).toEqual({ code: 2, stdout: '' });
    expect(stderr).toContain(words);
  });
});

describe('as a process', () => {
  const root = join(__dirname, '../../..');
  const command = ['--import', 'tsx', 'server/boot/plan.ts'];

  test('prints one JSON object and ends with 0', () => {
    const out = execFileSync(process.execPath, [...command, '--template', 'proof'], { cwd: root, encoding: 'utf8' });
    expect(JSON.parse(out)).toMatchObject({ advice: [] });
  });

  test('ends with 2 for unusable input', () => {
    const { status, stdout, stderr } = spawnSync(process.execPath, [...command, 'nothing.json'], { cwd: root, encoding: 'utf8' });
    expect({ status, stdout }).toEqual({ status: 2, stdout: '' });
    expect(stderr).toContain('nothing.json');
  });
});
