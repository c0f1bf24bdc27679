import { addedStepColumns, readSteps, stepColumns, stepsCsv } from '@/shared/archive/step-csv';
import { stepsJson } from '@/shared/archive/step-json';
import { smallArchiveInput } from '../../support/small-archive';

const { steps } = smallArchiveInput();
const head = { run: '01J0RUN', protocol: 'Short', rig: 'Wide' };

test('the JSON of a step log says what the CSV says, row by row, under the same names and in the same order', () => {
  const file = JSON.parse(stepsJson(head, steps)) as { steps: Record<string, unknown>[] };
  const columns = [...stepColumns, ...addedStepColumns];
  expect(file).toMatchObject({ format: 'evenfall-steps', version: 1, ...head });
  expect(file.steps.map((step) => Object.keys(step))).toEqual(steps.map(() => columns));
  const asCsv = file.steps.map((step) => columns.map((name) => (step[name] === null ? '' : String(step[name]))));
  const read = readSteps(stepsCsv(steps));
  const csv = stepsCsv(read.map((row) => ({ ...row, label: '' })));
  const cells = csv
    .trim()
    .split('\n')
    .slice(1)
    .map((line) => line.split(','));
  const labelAt = columns.indexOf('label');
  expect(asCsv.map((row) => row.map((cell, at) => (at === labelAt ? '' : cell)))).toEqual(cells);
});

test('texts stand as they were written and what is not known is null, not an empty text', () => {
  const file = JSON.parse(stepsJson(head, steps)) as { steps: Record<string, unknown>[] };
  expect(file.steps[1]).toMatchObject({
    label: '=SUM(A1), "quoted"',
    start_utc: '2026-03-01T22:03:20.000125Z',
    u_start_s: 0.001,
    good: true,
  });
  expect(file.steps[2]).toMatchObject({ end_utc: null, u_end_s: null, outcome: null, good: null });
});
