import { excludedPart, excludedWords, partOf, touching, wholeOf } from '@/components/data/stretch';
import type { ExclusionView } from '@/shared/contracts/exclusions';

const minute = 60_000;
const evening = Date.parse('2031-02-14T21:00:00Z');
/** A dwell of ten minutes and 0.4 s. */
const dwell = { startUtcMs: evening, endUtcMs: evening + 10 * minute + 400 };

const excluded = (fromMin: number, toMin: number, withdrawn = false): ExclusionView => {
  const act = { at: '2031-02-15T08:00:00.000Z', by: 'Tam Ferrowdale', reason: 'a door' };
  const stretch = { startUtcMs: evening + fromMin * minute, endUtcMs: evening + toMin * minute };
  return { id: `${String(fromMin)}`, runId: 'run', ...stretch, made: act, withdrawn: withdrawn ? act : null };
};

test('a step as it is offered is the whole step, to its last moment', () => {
  expect(wholeOf(dwell)).toEqual({ from: '0', to: '601' });
  expect(partOf(dwell, wholeOf(dwell)).stretch).toEqual(dwell);
});

test('a part is counted from the beginning of the step, with either decimal sign', () => {
  const { stretch } = partOf(dwell, { from: '60', to: '90,5' });
  expect(stretch).toEqual({ startUtcMs: evening + minute, endUtcMs: evening + 90_500 });
});

test.each([
  ['nothing', { from: '', to: '601' }, { from: 'a number of seconds from 0 to 601' }],
  ['a time before the step', { from: '-5', to: '601' }, { from: 'a number of seconds from 0 to 601' }],
  ['a time after the step', { from: '0', to: '700' }, { to: 'a number of seconds from 0 to 601' }],
  ['an end before the beginning', { from: '90', to: '60' }, { to: 'more than 90 s, where the stretch begins' }],
])('%s is refused where it was typed, with what would be right', (_, typed, errors) => {
  expect(partOf(dwell, typed)).toEqual({ stretch: null, errors });
});

test('a step is excluded when stretches in force cover all of it, whatever their order, and partly when there is a hole', () => {
  expect(excludedPart([], dwell)).toBeNull();
  expect(excludedPart([excluded(4, 11), excluded(-1, 5)], dwell)).toBe('excluded');
  expect(excludedPart([excluded(6, 11), excluded(-1, 5)], dwell)).toBe('partly excluded');
  expect(excludedPart([excluded(-1, 5), excluded(4, 11, true)], dwell)).toBe('partly excluded');
  expect(excludedPart([excluded(-1, 11, true)], dwell)).toBeNull();
});

test('what only meets the step at its end takes nothing of it; what was withdrawn is still told of', () => {
  const list = [excluded(-5, 0), excluded(11, 12), excluded(2, 3, true)];
  expect(touching(list, dwell)).toEqual([list[2]]);
});

test('what is excluded is told to those who do not see the hatching: when, how long, why; what was withdrawn is not', () => {
  const told = excludedWords([excluded(0, 2), excluded(4, 5, true)], 'UTC').replace(/\u202f/g, ' ');
  expect(told).toBe('1 excluded, hatched: 21:00:00 to 21:02:00, 2 min (a door)');
  expect(excludedWords([excluded(4, 5, true)], 'UTC')).toBe('');
  const many = excludedWords(
    Array.from({ length: 7 }, (_, k) => excluded(k, k + 0.5)),
    'UTC',
  );
  expect(many).toMatch(/^7 excluded, hatched: .*; 2 more$/);
});
