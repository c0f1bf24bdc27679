import { completeMapping, importReducer, noImport, undecided, type ImportState } from '@/components/data/import-draft';
import { columnNames, previewRows } from '@/components/data/file-preview';
import type { ImportCheck } from '@/shared/contracts/data';
import type { ImportView, RememberedMapping } from '@/shared/contracts/import-files';

const findings: ImportCheck['findings'] = {
  ...{ held: 0, fresh: 9, equal: 0, different: 0, differing: [], frozen: false, among: { rows: 0, stretches: [] } },
  ...{ outOfReach: { rows: 0, leavable: false }, outsideRun: { before: 0, after: 0 }, gaps: { count: 0, totalS: 0, longest: [] } },
};
const check: ImportCheck = {
  ...{ ok: true, rows: 9, firstAt: null, lastAt: null, medianIntervalS: null, problems: [], problemCount: 0, overlap: '', findings },
};

const imported = (ambiguous: string[]): ImportView => ({
  id: 'i1',
  runId: 'run-1',
  fileName: 'night.csv',
  state: 'received',
  ...{ bytes: 900, wantedBytes: 900, changedAt: null, sha256: null },
  ...{ createdAt: '2031-02-14T20:00:00.000Z', createdBy: 'Tam', storedAt: null, channelId: null },
  preview: {
    columns: ['time', 'spot'].map((name, index) => ({ index, name, sample: '' })),
    rows: [],
    ambiguous,
    mapping: { delimiter: ';', decimal: ',', headerRow: true, timeColumn: 0, timeFormat: 'iso', valueColumn: 1, unit: 'rad' },
  },
});
const received = (ambiguous: string[], remembered: readonly RememberedMapping[] = []): ImportState =>
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
  const last = (channelName: string, columns: string[], unit: 'mm' | 'urad' = 'mm'): RememberedMapping => ({
    ...{ channelName, columns, mapping: { ...mapping, unit }, usedAt: '2031-02-14T20:00:00.000Z', usedBy: 'Tam' },
  });
  const again = received(['unit'], [last('scale', ['time', 'spot'])]);
  expect(again.remembered?.channelName).toBe('scale');
  expect(mappingOf(again)?.mapping?.unit).toBe('mm');
  expect(received(['unit'], [last('scale', ['t', 'x'])]).remembered).toBeNull();
  // That of the same channel goes before that of another one, whichever was used last.
  const both = received(['unit'], [last('scale', ['time', 'spot']), last('deflection', ['time', 'spot'], 'urad')]);
  expect(mappingOf(both)?.mapping?.unit).toBe('urad');
  const guessed = importReducer(both, { kind: 'guessed' });
  expect(guessed.remembered).toBeNull();
  expect(mappingOf(guessed)?.missing).toEqual(['the unit of the deflection']);
});

test('a changed mapping is unchecked again, and what was typed stays', () => {
  const checked = importReducer(importReducer(received([]), { kind: 'named', channelName: 'spot' }), { kind: 'checked', check });
  expect(checked.check).toBe(check);
  const changed = change(checked, { unit: 'm' });
  expect(changed.check).toBeNull();
  expect(changed.channelName).toBe('spot');
  expect(importReducer(checked, { kind: 'named', channelName: 'other' }).check).toBeNull();
});

test('what the check found must be decided, each by itself, and anew after another check', () => {
  const found = { ...check, ok: false, problemCount: 2, findings: { ...findings, different: 3, outOfReach: { rows: 2, leavable: true } } };
  const checked = importReducer(received([]), { kind: 'checked', check: found });
  expect(undecided(found, checked.choices)).toEqual(['rows that cannot be read', 'which value counts at the same instant']);
  const settled = importReducer(checked, { kind: 'settled', choices: { outOfReach: 'leave-out', sameInstant: 'keep' } });
  expect(undecided(found, settled.choices)).toEqual([]);
  expect(undecided({ ...found, problemCount: 3 }, settled.choices)).toEqual(['rows that cannot be read']);
  expect(undecided({ ...check, findings: { ...findings, among: { rows: 1, stretches: [] } } }, settled.choices)).toHaveLength(1);
  expect(importReducer(settled, { kind: 'checked', check: found }).choices.sameInstant).toBe('refuse');
});

test('the preview follows the chosen delimiter', () => {
  const head = 'time;spot\n2031-03-14T01:00:00Z;12,4\n';
  expect(columnNames(previewRows(head, ';'), true)).toEqual(['time', 'spot']);
  expect(columnNames(previewRows(head, ','), true)).toEqual(['time;spot', 'column 2']);
});
