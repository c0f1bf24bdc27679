import { fireEvent, render, screen, within } from '@testing-library/react';
import { stepsOfLog, stepsOfPlan, SwingStrip } from '@/components/charts';
import { stripSummary } from '@/components/charts/strip-summary';
import { nowUtcMs, rowsAt, timeline, timeZone } from '../fixtures/run';

const rows = rowsAt(nowUtcMs);
const steps = [...stepsOfLog(rows), ...stepsOfPlan(timeline.items.slice(rows.length))];
const plain = (text: string | null) => (text ?? '').replaceAll('\u202f', ' ');

test('says in words what it shows: sides, span with zone, progress, the present', () => {
  const words = plain(stripSummary({ steps, timeZone, nowUtcMs, hasMeasured: true }));
  expect(words).toBe(
    '16 near dwells and 16 far dwells, from 21:58 to 05:40, Europe/Oslo, 7 h 42 min. 19 of 32 dwells done. Now: dwell at near. The solid line is the measured deflection.',
  );
});

test('counts dwells that are not good', () => {
  const bad = steps.map((step) => (step.kind === 'dwell' && step.phase === 'past' ? { ...step, good: false } : step));
  expect(stripSummary({ steps: bad, timeZone, nowUtcMs, hasMeasured: false })).toContain('19 of 32 dwells done, 19 not good.');
});

test('an empty strip says so', () => {
  expect(stripSummary({ steps: [], timeZone, hasMeasured: false })).toBe('No steps yet.');
});

test('what rings down after a kick is no dwell of the series', () => {
  const kicked = steps.map((step, i) => (i === steps.findIndex(({ kind }) => kind === 'dwell') ? { ...step, kind: 'ring-down' } : step));
  const counted = (own: typeof steps) =>
    Number(/of (\d+) dwells/.exec(stripSummary({ steps: own, timeZone, nowUtcMs, hasMeasured: false }))?.[1]);
  expect(counted(kicked)).toBe(counted(steps) - 1);
});

test('offers a picture with its summary and a table with every step', () => {
  render(<SwingStrip steps={steps} timeZone={timeZone} title="North bench" nowUtcMs={nowUtcMs} />);
  expect(screen.getByRole('img').getAttribute('aria-label')).toContain('North bench: 16 near dwells');
  const table = screen.getByRole('table');
  expect(within(table).getAllByRole('row')).toHaveLength(steps.length + 1);
  expect(within(table).getAllByText('running')).toHaveLength(1);
});

test('the arrow keys move the choice from step to step', () => {
  const chosen: string[] = [];
  render(
    <SwingStrip steps={steps} timeZone={timeZone} title="North bench" selectedKey={steps[2]?.key} onSelect={(key) => chosen.push(key)} />,
  );
  fireEvent.keyDown(screen.getByRole('button'), { key: 'ArrowRight' });
  fireEvent.keyDown(screen.getByRole('button'), { key: 'ArrowLeft' });
  expect(chosen).toEqual([steps[3]?.key, steps[1]?.key]);
});
