import { completeMapping, importReducer, noImport, type ImportState } from '@/components/data/import-draft';
import { columnNames, previewRows } from '@/components/data/file-preview';
import type { RememberedMapping } from '@/components/data/remembered-mapping';
import type { ImportView } from '@/shared/contracts/data';

const imported = (ambiguous: string[]): ImportView => ({
  id: 'i1',
  runId: 'run-1',
  fileName: 'night.csv',
  state: 'received',
  bytes: 900,
  sha256: null,
  preview: {
    columns: ['time', 'spot'].map((name, index) => ({ index, name, sample: '' })),
    rows: [],
    ambiguous,
    mapping: { delimiter: ';', decimal: ',', headerRow: true, timeColumn: 0, timeFormat: 'iso', valueColumn: 1, unit: 'rad' },
  },
});
const received = (ambiguous: string[], remembered: RememberedMapping | null = null): ImportState =>
  importReducer(noImport('deflection'), { kind: 'received', imported: imported(ambiguous), remembered });
const change = (state: ImportState, draft: Partial<NonNullable<ImportState['draft']>>) =>
  importReducer(state, { kind: 'changed', change: draft });
const mappingOf = (state: ImportState) => (state.draft === null ? null : completeMapping(state.draft));

test('what the file does not tell stays open until the person states it', () => {
  const state = received(['unit', 'decimal']);
  expect(mappingOf(state)).toEqual({ mapping: null, missing: ['the decimal sign', 'the unit of the deflection'] });
  const stated = change(change(state, { unit: 'mm' }), { decimal: ',' });
  expect(mappingOf(stated)?.mapping).toEqual({
    delimiter: ';',
    decimal: ',',
    headerRow: true,
    timeColumn: 0,
    timeFormat: 'iso',
    valueColumn: 1,
    unit: 'mm',
  });
});

test('the zone of times without one must be stated by the person', () => {
  const state = received(['timesWithoutZoneAreUtc']);
  expect(mappingOf(state)?.missing).toEqual(['which zone the times are in']);
  expect(mappingOf(change(state, { zone: 'UTC' }))?.mapping).toMatchObject({ timesWithoutZoneAreUtc: true });
  const local = mappingOf(change(state, { zone: 'Europe/Zurich' }))?.mapping;
  expect(local).toMatchObject({ timeZone: 'Europe/Zurich' });
  expect(local).not.toHaveProperty('timesWithoutZoneAreUtc');
  for (const zone of [' ', 'Quillfen', '+01:00'])
    expect(mappingOf(change(state, { zone }))?.missing).toEqual(['a time zone by its name, such as Europe/Oslo']);
  const counted = mappingOf(change(state, { zone: 'UTC', timeFormat: 'epoch-s' }))?.mapping;
  expect(counted).not.toHaveProperty('timesWithoutZoneAreUtc');
  expect(counted).not.toHaveProperty('timeZone');
});

test('elapsed time needs its beginning, and one column cannot be both', () => {
  const elapsed = change(received([]), { timeFormat: 'elapsed-s', elapsedFrom: '14.3.2031' });
  expect(mappingOf(elapsed)?.missing).toEqual(['when time 0 was']);
  expect(mappingOf(change(elapsed, { elapsedFrom: '2031-03-14T01:00:00Z' }))?.mapping).toMatchObject({
    elapsedFrom: '2031-03-14T01:00:00Z',
  });
  expect(mappingOf(change(received([]), { valueColumn: 0 }))?.missing).toEqual(['two different columns for time and deflection']);
});

test('the mapping of last time fills in what is open, but only for a file with the same columns', () => {
  const mapping: RememberedMapping['mapping'] = {
    delimiter: ';',
    decimal: ',',
    headerRow: true,
    timeColumn: 0,
    timeFormat: 'iso',
    valueColumn: 1,
    unit: 'mm',
  };
  const again = received(['unit'], { columns: ['time', 'spot'], mapping });
  expect(again.remembered).toBe(true);
  expect(mappingOf(again)?.mapping?.unit).toBe('mm');
  expect(received(['unit'], { columns: ['t', 'x'], mapping }).remembered).toBe(false);
});

test('a changed mapping is unchecked again, and what was typed stays', () => {
  const check = { ok: true, rows: 9, firstAt: null, lastAt: null, medianIntervalS: null, problems: [], problemCount: 0, overlap: '' };
  const checked = importReducer(importReducer(received([]), { kind: 'named', channelName: 'spot' }), { kind: 'checked', check });
  expect(checked.check).toBe(check);
  const changed = change(checked, { unit: 'm' });
  expect(changed.check).toBeNull();
  expect(changed.channelName).toBe('spot');
});

test('the preview follows the chosen delimiter', () => {
  const head = 'time;spot\n2031-03-14T01:00:00Z;12,4\n';
  expect(columnNames(previewRows(head, ';'), true)).toEqual(['time', 'spot']);
  expect(columnNames(previewRows(head, ','), true)).toEqual(['time;spot', 'column 2']);
});
