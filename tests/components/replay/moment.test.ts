import { alarmMoment, momentAt, neighbourStart } from '@/components/replay/moment';
import type { StepRowView } from '@/shared/contracts/runs';
import { demoRigWide } from '@/shared/rig/demo-rigs';

const row = (seq: number, kind: string, times: [number, number | null], angles: [number | null, number | null]): StepRowView => ({
  ...{ seq, path: String(seq), kind, label: '', station: '', plannedStartUtcMs: times[0], plannedEndUtcMs: times[1] },
  ...{ startUtcMs: times[0], endUtcMs: times[1], uStartS: 0, uEndS: 0, angleStartDeg: angles[0], angleEndDeg: angles[1] },
  ...{ outcome: 'done', angleSource: 'counted', uAngleDeg: 0, good: null },
});
const rows = [
  row(1, 'swing', [1000, 21_000], [-20, 20]),
  row(2, 'dwell', [21_000, 121_000], [20, 20]),
  row(3, 'swing', [121_000, null], [20, null]),
];
const at = (utcMs: number) => momentAt({ rows, measured: null, rig: demoRigWide }, utcMs);

test('a swing speeds up and slows down between its two angles, in the time that it took', () => {
  expect(at(1000).angleDeg).toBeCloseTo(-20, 9);
  // Symmetric about its middle, and slower than a steady turn at its ends.
  expect(at(11_000).angleDeg).toBeCloseTo(0, 9);
  expect((at(6000).angleDeg ?? NaN) + (at(16_000).angleDeg ?? NaN)).toBeCloseTo(0, 9);
  expect(at(2000).angleDeg).toBeLessThan(-18);
  expect(at(21_000)).toMatchObject({ angleDeg: 20, row: { seq: 2 } });
});

test('before the first step and in a motion whose end is not known nothing is made up', () => {
  expect(at(999)).toEqual({ row: null, between: false, angleDeg: null, rad: null });
  expect(at(130_000)).toMatchObject({ angleDeg: 20, row: { seq: 3 } });
});

test('while the run was held no step is said to go on', () => {
  const held = [row(1, 'dwell', [0, 60_000], [20, 20]), row(2, 'dwell', [600_000, 660_000], [20, 20])];
  const momentOf = (utcMs: number) => momentAt({ rows: held, measured: null, rig: demoRigWide }, utcMs);
  expect([30_000, 300_000, 600_000].map((utcMs) => momentOf(utcMs).between)).toEqual([false, true, false]);
});

test('of a night so long that it is drawn by fewer samples than one a minute, what lies between two is no gap', () => {
  const x = Array.from({ length: 100 }, (_, k) => 90_000 * k);
  const measured = { x, y: x.map((ms) => ms / 1e9) };
  expect(momentAt({ rows, measured, rig: demoRigWide }, 90_000 * 50 + 45_000).rad).toBeCloseTo((90_000 * 50 + 45_000) / 1e9, 9);
});

test('a gap in the deflection has no value', () => {
  const seconds = [...Array(50).keys(), 200];
  const measured = { x: seconds.map((second) => 1000 * second), y: seconds.map((second) => second / 1e3) };
  expect(momentAt({ rows, measured, rig: demoRigWide }, 1500).rad).toBeCloseTo(1.5e-3, 9);
  expect(momentAt({ rows, measured, rig: demoRigWide }, 120_000).rad).toBeNull();
});

test('from step to step, and no further than the run', () => {
  expect(neighbourStart(rows, 1000, 1)).toBe(21_000);
  expect(neighbourStart(rows, 121_000, -1)).toBe(21_000);
  expect(neighbourStart(rows, 130_000, 1)).toBeNull();
  expect(neighbourStart(rows, 1000, -1)).toBeNull();
});

test('an alarm is to come, stands from the moment it was raised, and is over once it went; one that has no end stands to the end', () => {
  const raisedAt = '2031-02-14T22:10:00.000Z';
  const untilAt = '2031-02-14T22:12:00.000Z';
  const [raised, until] = [Date.parse(raisedAt), Date.parse(untilAt)];
  expect([raised - 1, raised, until - 1, until].map((utcMs) => alarmMoment({ raisedAt, untilAt }, utcMs))).toEqual([
    'to come',
    'now',
    'now',
    'over',
  ]);
  expect(alarmMoment({ raisedAt, untilAt: null }, until + 1e9)).toBe('now');
  // One that was over as soon as it was raised is shown for a minute.
  expect([0, 59_999, 60_000].map((afterMs) => alarmMoment({ raisedAt, untilAt: raisedAt }, raised + afterMs))).toEqual([
    'now',
    'now',
    'over',
  ]);
});
