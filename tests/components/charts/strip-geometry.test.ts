import { layoutStrip, nowWindow, stepAt, wholeWindow } from '@/components/charts/strip-geometry';
import { laneOf, standsOf, stepsOfLog, stepsOfPlan } from '@/components/charts/strip-model';
import { deflection, nowUtcMs, rowsAt, startUtcMs, timeline } from '../fixtures/run';

const plan = stepsOfPlan(timeline.items);
const size = { widthPx: 340, heightPx: 150, lanePx: 18 };

describe('the lanes', () => {
  test('near stands above, far below, everything else between; the back stations belong to their fronts', () => {
    expect(['near', 'nearBack', 'far', 'farBack', 'clear', ''].map(laneOf)).toEqual(['near', 'near', 'far', 'far', 'other', 'other']);
    const { blocks } = layoutStrip({ steps: plan, window: wholeWindow(plan), ...size });
    const near = blocks.filter((block) => block.lane === 'near');
    const far = blocks.filter((block) => block.lane === 'far');
    expect(near.length).toBe(17);
    expect(far.length).toBe(16);
    expect(Math.max(...near.map((block) => block.y + block.height))).toBeLessThan(Math.min(...far.map((block) => block.y)));
  });

  test('blocks do not overlap and keep the order of time', () => {
    const { blocks } = layoutStrip({ steps: plan, window: wholeWindow(plan), ...size });
    for (let i = 1; i < blocks.length; i += 1)
      expect(blocks[i]?.x).toBeGreaterThanOrEqual((blocks[i - 1]?.x ?? 0) + (blocks[i - 1]?.width ?? 0) - 1.5);
  });

  test('steps that measure nothing join into one stand, dwells never do', () => {
    const still = stepsOfPlan([
      { path: '1', kind: 'settle', label: '', station: 'near', startUtcMs: 0, endUtcMs: 10, angleFromDeg: 20, angleToDeg: 20 },
      { path: '2', kind: 'wait', label: '', station: 'near', startUtcMs: 10, endUtcMs: 20, angleFromDeg: 20, angleToDeg: 20 },
      { path: '3', kind: 'dwell', label: '', station: 'near', startUtcMs: 20, endUtcMs: 30, angleFromDeg: 20, angleToDeg: 20 },
      { path: '4', kind: 'dwell', label: '', station: 'near', startUtcMs: 30, endUtcMs: 40, angleFromDeg: 20, angleToDeg: 20 },
    ]);
    expect(standsOf(still).map((stand) => stand.keys)).toEqual([['1', '2'], ['3'], ['4']]);
  });
});

describe('the curve', () => {
  const all = deflection(startUtcMs, nowUtcMs);
  const measured = { x: all.utcMs, y: all.value };

  test('stays between the lanes', () => {
    const { measured: segments } = layoutStrip({ steps: plan, window: wholeWindow(plan), ...size, measured });
    const ys = segments.flat().map(([, y]) => y);
    expect(Math.min(...ys)).toBeGreaterThanOrEqual(18);
    expect(Math.max(...ys)).toBeLessThanOrEqual(132);
  });

  test('missing data are a gap, not a line', () => {
    const keep = all.utcMs.map((at) => at < startUtcMs + 3_600_000 || at > startUtcMs + 4_200_000);
    const holed = { x: all.utcMs.filter((_, index) => keep[index]), y: all.value.filter((_, index) => keep[index]) };
    expect(layoutStrip({ steps: plan, window: wholeWindow(plan), ...size, measured }).measured).toHaveLength(1);
    expect(layoutStrip({ steps: plan, window: wholeWindow(plan), ...size, measured: holed }).measured).toHaveLength(2);
  });

  test('a peak of one sample survives the thinning', () => {
    const y = all.value.map(() => 0);
    y[1234] = 1;
    const layout = layoutStrip({ steps: plan, window: wholeWindow(plan), ...size, measured: { x: all.utcMs, y } });
    const top = Math.min(...layout.measured.flat().map(([, py]) => py));
    expect(top).toBeCloseTo(layout.yToPx(1), 6);
  });

  test('positive angles, towards near, are drawn upwards', () => {
    const { yToPx } = layoutStrip({ steps: plan, window: wholeWindow(plan), ...size, measured });
    expect(yToPx(1e-3)).toBeLessThan(yToPx(-1e-3));
  });
});

describe('now', () => {
  const rows = rowsAt(nowUtcMs);
  const steps = [...stepsOfLog(rows), ...stepsOfPlan(timeline.items.slice(rows.length))];

  test('the now-line lies within its window, with more past than future', () => {
    const window = nowWindow(steps, nowUtcMs);
    const { nowX } = layoutStrip({ steps, window, ...size, nowUtcMs });
    expect(nowX).toBeGreaterThan(size.widthPx / 2);
    expect(nowX).toBeLessThan(size.widthPx);
  });

  test('outside the window there is no now-line', () => {
    expect(layoutStrip({ steps, window: { fromUtcMs: startUtcMs, toUtcMs: startUtcMs + 1000 }, ...size, nowUtcMs }).nowX).toBeNull();
  });

  test('a tap finds the step under it, and the nearest one in a pause', () => {
    const dwell = steps.find((step) => step.phase === 'running');
    expect(stepAt(steps, nowUtcMs)?.key).toBe(dwell?.key);
    expect(stepAt(steps, startUtcMs - 99_999)?.key).toBe(steps[0]?.key);
  });
});
