import { stepColumns, stepsCsv } from '@/shared/archive/step-csv';
import type { StepRow } from '@/shared/archive/run-records';
import { unprovedDwells } from '@/shared/archive/unproved-dwells';

const dwell = (seq: number, angleSource: StepRow['angleSource']): StepRow => ({
  ...{ seq, path: `${seq}.dwell`, kind: 'dwell', label: '', station: 'near' },
  ...{ plannedStartUtcMs: seq, plannedEndUtcMs: null, startUtcMs: seq, endUtcMs: seq + 1, uStartS: 0, uEndS: 0 },
  ...{ angleStartDeg: 20, angleEndDeg: 20, outcome: 'done', angleSource, uAngleDeg: 0.01, good: true },
});
const warned = (...rows: StepRow[]) => unprovedDwells(stepsCsv(rows), rows);

describe('dwells whose angle nothing proved', () => {
  test('are named in a warning', () => {
    expect(warned(dwell(1, 'edge-verified'), dwell(2, 'counted'), dwell(4, 'counted'))).toEqual([
      { code: 'angle-unproved', message: expect.stringContaining('2 dwells (seq 2, 4) are not proved') },
    ]);
    expect(warned(dwell(7, 'counted'))[0]?.message).toContain('the dwell seq 7 is not proved');
  });

  test('are not those at an edge or an encoder, nor other steps', () => {
    expect(warned(dwell(1, 'edge-verified'), dwell(2, 'encoder'), { ...dwell(3, 'counted'), kind: 'swing' })).toEqual([]);
  });

  test('cannot be told in a log that does not say where its angles come from', () => {
    expect(unprovedDwells(`${stepColumns.join(',')}\n`, [dwell(1, 'counted')])).toEqual([]);
  });
});
