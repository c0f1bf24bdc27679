import type { StepRow } from '@/shared/archive/run-records';
import { compareMeasured, compareRooms, compareSteps } from '@/shared/morning/run-comparison';

/** Two runs side by side. */

const beganMs = Date.UTC(2031, 1, 14, 21);
let seq = 0;
const row = (path: string, [fromS, toS]: [number, number | null], change: Partial<StepRow> = {}): StepRow => ({
  ...{ seq: (seq += 1), path, kind: path.split('.').at(-1) as StepRow['kind'], label: '', station: 'near' },
  ...{ plannedStartUtcMs: beganMs + 1000 * fromS, plannedEndUtcMs: null, startUtcMs: beganMs + 1000 * fromS },
  ...{ endUtcMs: toS === null ? null : beganMs + 1000 * toS, uStartS: 0.001, uEndS: 0.001, angleStartDeg: 0, angleEndDeg: 20.18 },
  ...{ outcome: 'done' as const, angleSource: 'counted' as const, uAngleDeg: 0.02, good: null },
  ...change,
});
const night = (mrad: number, u: number | null, periodS: number) => ({
  ...{ runId: '00000000-0000-4000-8000-000000000001', startedAt: '2031-02-14T21:00:00.000Z', control: false },
  reversal_rad: { value: mrad / 1000, u: u === null ? null : u / 1000 },
  period_s: { value: periodS, u: 0.03 },
  decayTime_s: null,
  kappa_N_m: null,
});
const sheet = (
  tonight: ReturnType<typeof night> | null,
  room: { name: string; unit: string; least: number; greatest: number; inStep: null }[] = [],
) => ({
  tonight,
  G: tonight === null ? null : { value: 6.67e-11, u: 2e-13 },
  drift: null,
  room,
});

describe('what was measured', () => {
  test('differences are told in their own standard uncertainty (GUM 5.1.2: of a difference, the root of the sum of squares)', () => {
    const found = compareMeasured(sheet(night(1.2, 0.003, 420.1)), sheet(night(1.205, 0.004, 420.1)));
    expect(found.find(({ label }) => label === 'near − far')?.inU).toBeCloseTo(1, 9);
    expect(found.find(({ label }) => label === 'damped period')?.inU).toBe(0);
    expect(found.map(({ label }) => label)).not.toContain('decay time');
  });

  test('G of two runs of one rig, which share its lengths and masses, is shown and not judged by its own u', () => {
    expect(compareMeasured(sheet(night(1.2, 0.003, 420)), sheet(night(1.3, 0.003, 420))).find(({ label }) => label === 'G')).toMatchObject({
      ...{ one: { value: 6.67e-11 }, other: { value: 6.67e-11 }, inU: null },
    });
  });

  test('what only one of them has stands alone; without an u nothing is judged; a channel of another unit is another channel', () => {
    const found = compareMeasured(sheet(null), sheet(night(1.2, null, 420)));
    expect(found.find(({ label }) => label === 'near − far')).toMatchObject({ one: null, inU: null });
    const both = compareMeasured(sheet(night(1.2, null, 420)), sheet(night(1.3, 0.001, 420)));
    expect(both.find(({ label }) => label === 'near − far')?.inU).toBeNull();
    const box = { name: 'box', unit: 'Cel', least: 20, greatest: 20.6, inStep: null };
    const rooms = compareRooms(
      sheet(null, [box, { ...box, name: 'hall' }]),
      sheet(null, [
        { ...box, unit: 'K' },
        { ...box, name: 'hall', least: 18 },
      ]),
    );
    expect(rooms.map(({ name, unit, one, other }) => [name, unit, one?.least, other?.least])).toEqual([
      ['box', 'Cel', 20, undefined],
      ['hall', 'Cel', 20, 18],
      ['box', 'K', undefined, 20],
    ]);
  });
});

describe('steps', () => {
  test('equal logs on other days differ in nothing', () => {
    const log = [row('1.home', [0, 30]), row('2.repeat[1].1.swing', [30, 45]), row('2.repeat[1].2.dwell', [45, 645])];
    const later = log.map((one) => ({ ...one, startUtcMs: one.startUtcMs + 9e7, endUtcMs: (one.endUtcMs ?? 0) + 9e7 + 400 }));
    expect(compareSteps(log, later).map(({ differs, shiftS }) => [differs, shiftS])).toEqual([
      [[], 0],
      [[], 0],
      [[], 0],
    ]);
  });

  test('a step that was begun again counts by its last row, and shifts what follows without making it differ', () => {
    const one = [row('1.swing', [0, 15]), row('2.dwell', [15, 615]), row('3.swing', [615, 630])];
    const other = [
      row('1.swing', [0, 15]),
      row('2.dwell', [15, 100], { outcome: 'cut short' }),
      row('2.dwell', [200, 800]),
      row('3.swing', [800, 815]),
    ];
    const found = compareSteps(one, other);
    expect(found.map(({ path, differs }) => [path, differs])).toEqual([
      ['1.swing', []],
      ['2.dwell', ['begun 1 and 2 times']],
      ['3.swing', []],
    ]);
    expect(found[2]?.shiftS).toBe(185);
  });

  test('outcome, length, angle and what only one of them has are told, where they come', () => {
    const one = [row('1.swing', [0, 15]), row('2.dwell', [15, 615], { good: true }), row('3.mark', [615, 615])];
    const other = [
      row('1.swing', [0, 15], { angleEndDeg: 20.3 }),
      row('2.dwell', [15, 600], { good: false, outcome: 'skipped' }),
      row('2b.wait', [600, 610]),
    ];
    expect(compareSteps(one, other).map(({ path, differs }) => [path, differs])).toEqual([
      ['1.swing', ['ended at another angle']],
      ['2.dwell', ['done, then skipped', 'good only in the first', 'shorter']],
      ['2b.wait', ['only in the second']],
      ['3.mark', ['only in the first']],
    ]);
  });
});
