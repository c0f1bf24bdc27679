import { planLayout, polar, stationNear } from '@/components/charts/plan-geometry';
import { reversalPoints } from '@/shared/evaluation/reversal-points';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';

test('angles grow counter-clockwise from the arm at rest, which lies to the right', () => {
  expect(polar(1, 0)).toEqual({ x: 1, y: 0 });
  expect(polar(1, 90).y).toBeCloseTo(1, 12);
});

test('each station has its tick on both sides, since either source meets either ball', () => {
  const near = planLayout(demoRigWide)
    .ticks.filter((tick) => tick.lane === 'near')
    .map((tick) => ((tick.angleDeg % 360) + 360) % 360);
  expect(near.map((angle) => angle.toFixed(2)).sort()).toEqual(['20.18', '200.18']);
});

test('keep-out arcs are drawn also half a turn further on, and all matter fits into the square', () => {
  const layout = planLayout(demoRigNarrow);
  expect(layout.keepOut).toEqual([
    [-29, 29],
    [151, 209],
  ]);
  expect(layout.orbit + layout.sourceRadius).toBeLessThanOrEqual(1);
});

test('a station is recognised within half a degree, also a whole turn away', () => {
  expect(stationNear(demoRigWide, 20.3)).toBe('near');
  expect(stationNear(demoRigWide, 380.18)).toBe('near');
  expect(stationNear(demoRigWide, 5)).toBeNull();
});

test('a steady drift does not show in the reversals, and dwells left out make none', () => {
  const dwell = (seq: number, station: string, value: number) => ({
    seq,
    station,
    theta_rad: { value, u: 1e-6 },
    samples: 100,
    used: true,
    why: null,
  });
  const drift = 5e-6;
  const dwells = Array.from({ length: 8 }, (_, index) =>
    dwell(index + 1, index % 2 === 0 ? 'near' : 'far', (index % 2 === 0 ? 1e-3 : -1e-3) + index * drift),
  );
  const points = reversalPoints(dwells);
  expect(points).toHaveLength(7);
  for (const point of points.slice(0, -1)) expect(point.rad).toBeCloseTo(2e-3, 12);
  expect(reversalPoints(dwells.map((each) => ({ ...each, used: false })))).toEqual([]);
});
