import { momentAt, neighbourStart } from '@/components/replay/moment';
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
  expect(at(999)).toEqual({ row: null, angleDeg: null, rad: null });
  expect(at(130_000)).toMatchObject({ angleDeg: 20, row: { seq: 3 } });
});

test('a gap in the deflection has no value', () => {
  const measured = { x: [1000, 2000, 90_000], y: [1e-3, 2e-3, 3e-3] };
  expect(momentAt({ rows, measured, rig: demoRigWide }, 1500).rad).toBeCloseTo(1.5e-3, 9);
  expect(momentAt({ rows, measured, rig: demoRigWide }, 40_000).rad).toBeNull();
});

test('from step to step, and no further than the run', () => {
  expect(neighbourStart(rows, 1000, 1)).toBe(21_000);
  expect(neighbourStart(rows, 121_000, -1)).toBe(21_000);
  expect(neighbourStart(rows, 130_000, 1)).toBeNull();
  expect(neighbourStart(rows, 1000, -1)).toBeNull();
});
