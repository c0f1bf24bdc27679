import { occurrencesOf, stoodWithin, type HistoryFact } from '@/shared/alarms/occurrences';

/** Each time an alarm was raised: when, until when, who saw it. */

const told = (at: number, fact: string, more: Partial<HistoryFact> = {}): HistoryFact => ({
  ...{ alarmId: 'door', occurrence: 1, at, fact, by: '', words: '' },
  ...more,
});
const lasting = () => false;

test('an alarm that came, was seen, dealt with and went away', () => {
  const facts = [
    told(100, 'raised', { words: 'The door was opened.' }),
    told(160, 'acknowledged', { by: 'Ilse' }),
    told(200, 'returned'),
    told(260, 'confirmed', { by: 'Ilse', words: 'closed it' }),
  ];
  expect(occurrencesOf(facts, lasting)).toEqual([
    {
      ...{ alarmId: 'door', occurrence: 1, raisedUtcMs: 100, words: 'The door was opened.', untilUtcMs: 200 },
      ...{ seen: { by: 'Ilse', utcMs: 160 }, done: { by: 'Ilse', utcMs: 260, note: 'closed it' }, aside: null },
    },
  ]);
});

test('a second time stands by itself, and what another alarm did is not mixed in', () => {
  const facts = [
    told(100, 'raised'),
    told(110, 'raised', { alarmId: 'line' }),
    told(120, 'returned'),
    told(300, 'raised', { occurrence: 2 }),
    told(310, 'acknowledged', { alarmId: 'line', by: 'Tam' }),
  ];
  const found = occurrencesOf(facts, lasting);
  expect(found.map(({ alarmId, occurrence, untilUtcMs, seen }) => [alarmId, occurrence, untilUtcMs, seen?.by ?? null])).toEqual([
    ['door', 1, 120, null],
    ['line', 1, null, 'Tam'],
    ['door', 2, null, null],
  ]);
});

test('one that happens in a moment is over at once; one whose raising is not told is left out', () => {
  expect(occurrencesOf([told(100, 'raised')], () => true)[0]?.untilUtcMs).toBe(100);
  expect(occurrencesOf([told(100, 'returned')], lasting)).toEqual([]);
});

test('what was put aside says by whom and why, unless it was over before', () => {
  const shelved = told(150, 'shelved', { by: 'Ilse', words: 'the cleaner' });
  expect(occurrencesOf([told(100, 'raised'), shelved], lasting)[0]).toMatchObject({
    untilUtcMs: null,
    aside: { by: 'Ilse', utcMs: 150, why: 'the cleaner' },
  });
  expect(occurrencesOf([told(100, 'raised'), told(120, 'returned'), shelved], lasting)[0]?.aside).toBeNull();
});

test('an alarm concerns a run when it stood while the run went on', () => {
  const run = { fromUtcMs: 1000, toUtcMs: 2000 };
  const stood = (raisedUtcMs: number, untilUtcMs: number | null) => stoodWithin({ raisedUtcMs, untilUtcMs, aside: null }, run);
  expect([stood(500, 900), stood(500, 1500), stood(500, null), stood(1500, 1600), stood(2500, null)]).toEqual([
    ...[false, true, true, true, false],
  ]);
  expect(stoodWithin({ raisedUtcMs: 2500, untilUtcMs: null, aside: null }, { ...run, toUtcMs: null })).toBe(true);
  const shelf = { by: '', utcMs: 800, why: '' };
  expect(stoodWithin({ raisedUtcMs: 500, untilUtcMs: null, aside: shelf }, run)).toBe(false);
});
