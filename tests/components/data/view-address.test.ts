import { readAddress, writePanes, writeStretch } from '@/components/data/view-address';

const from = Date.parse('2031-02-14T21:00:00.000Z');

test('a stretch that was written reads back, to the millisecond around it', () => {
  expect(readAddress(writeStretch({ from: from + 0.4, to: from + 60_000.2 })).span).toEqual({ from, to: from + 60_001 });
});

test('the whole run leaves nothing in the address, and an empty address is the whole run', () => {
  expect(writeStretch(null)).toEqual({ from: undefined, to: undefined });
  expect(readAddress({})).toEqual({ span: null, cursor: null, panes: null });
});

test('a moment is shown with five minutes on both sides, and the cursor on it', () => {
  expect(readAddress({ at: '2031-02-14T21:00:00Z' })).toEqual({
    span: { from: from - 300_000, to: from + 300_000 },
    cursor: from,
    panes: null,
  });
});

test('a moment within a stretch leaves the stretch as it is', () => {
  const params = { from: '2031-02-14T21:00:00Z', to: '2031-02-14T22:00:00Z', at: '2031-02-14T21:10:00Z' };
  expect(readAddress(params)).toMatchObject({ span: { from, to: from + 3_600_000 }, cursor: from + 600_000 });
});

test.each([
  ['an end alone', { from: '2031-02-14T21:00:00Z' }],
  ['an end before the beginning', { from: '2031-02-14T21:00:00Z', to: '2031-02-14T20:00:00Z' }],
  ['what is no time', { from: 'yesterday', to: '2031-02-14T20:00:00Z' }],
])('%s counts as not there: the whole run is shown', (_, params) => {
  expect(readAddress(params).span).toBeNull();
});

test('which panes are open is kept, and that none is', () => {
  expect(readAddress({ panes: writePanes(['a', 'turntable']) }).panes).toEqual(['a', 'turntable']);
  expect(readAddress({ panes: writePanes([]) }).panes).toEqual([]);
});
