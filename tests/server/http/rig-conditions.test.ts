import { conditionsOf, type RigNow } from '@/server/http/work/rig-conditions';

/** What is seen of a rig, and what alarms it gives cause for. */

const utcMs = Date.parse('2031-02-14T23:00:00Z');
const quiet: RigNow = {
  utcMs,
  run: null,
  quarantined: null,
  link: { condition: 'ready', detail: '' },
  linkWasReady: true,
  open: { interlock: false, supply: false },
  deflectionUtcMs: null,
};
const running: NonNullable<RigNow['run']> = {
  id: 'run',
  state: 'running',
  reason: '',
  reasonCode: '',
  startedUtcMs: utcMs - 3_600_000,
  loud: null,
  dwells: { done: 0, good: 0, planned: 32 },
  periodS: 420,
};
const codesOf = (now: Partial<RigNow>) => conditionsOf({ ...quiet, ...now }).map(({ code }) => code);

test('a rig at rest gives cause for none', () => {
  expect(codesOf({})).toEqual([]);
  expect(codesOf({ run: running })).toEqual([]);
});

test('a held run is the alarm of its reason; a hold that a person asked for is none', () => {
  const held = (reasonCode: string) => codesOf({ run: { ...running, state: 'held', reasonCode, reason: 'Why.' } });
  expect(
    ['held-by-person', 'interlock', 'table-slipped', 'proof-failed', 'database-away', 'arm-ended', 'no-response', 'no-deflection'].map(
      held,
    ),
  ).toEqual([...[[], ['interlock'], ['home-edge'], ['proof-failed'], ['held'], ['held'], ['no-response'], ['no-deflection']]]);
});

test('the interlock that voided the arm is told once, with or without a run', () => {
  expect(codesOf({ open: { interlock: true, supply: false } })).toEqual(['interlock']);
  const run = { ...running, state: 'held' as const, reasonCode: 'interlock' };
  expect(codesOf({ run, open: { interlock: true, supply: true } })).toEqual(['interlock', 'supply']);
});

test('a line that has not yet answered for the first time is given a minute', () => {
  const lost = { condition: 'lost' as const, detail: 'no answer' };
  expect(conditionsOf({ ...quiet, link: lost, linkWasReady: false })).toMatchObject([{ code: 'link-lost', onDelayS: 60 }]);
  expect(conditionsOf({ ...quiet, link: lost })[0]?.onDelayS).toBeUndefined();
});

test('deflection that flowed and is silent for over a minute of a run; one that is brought in later is not missed', () => {
  expect(codesOf({ run: running, deflectionUtcMs: utcMs - 59_000 })).toEqual([]);
  expect(conditionsOf({ ...quiet, run: running, deflectionUtcMs: utcMs - 61_000 })).toMatchObject([
    { code: 'deflection-silent', sinceUtcMs: utcMs - 61_000 },
  ]);
  expect(codesOf({ run: running, deflectionUtcMs: null })).toEqual([]);
  expect(codesOf({ run: running, deflectionUtcMs: utcMs - 86_400_000 })).toEqual([]);
  expect(codesOf({ deflectionUtcMs: utcMs - 61_000 })).toEqual([]);
});

test('a dwell noisier than usual is told when a period has passed since it began, and no more after a quiet one', () => {
  const loud = { words: 'Noise about the fit of 90 µrad, more than 30 µrad.', sinceUtcMs: utcMs - 800_000 };
  expect(conditionsOf({ ...quiet, run: { ...running, loud } })).toMatchObject([
    { code: 'residual-high', ...loud, onDelayS: 420, runId: 'run' },
  ]);
});

test.each([
  ['before half time', { done: 15, good: 2, planned: 32 }, null],
  ['from half time on', { done: 16, good: 7, planned: 32 }, '7 of 16 dwells are good so far; 32 are planned.'],
  ['half of them good', { done: 16, good: 8, planned: 32 }, null],
  ['too few to say', { done: 3, good: 0, planned: 4 }, null],
])('few good dwells: %s', (_, dwells, words) => {
  const found = conditionsOf({ ...quiet, run: { ...running, dwells } });
  expect(found).toEqual(words === null ? [] : [expect.objectContaining({ code: 'few-good', words, runId: 'run' })]);
});
