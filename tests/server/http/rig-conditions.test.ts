import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import type { RunFacts } from '@/server/engine/run-facts';
import { excursionWords } from '@/server/http/work/channel-conditions';
import { finishByOf, lateWords } from '@/server/http/work/early-end';
import { conditionsOf, runNowOf, type RigNow } from '@/server/http/work/rig-conditions';
import { alarmCodes, alarmKinds, type AlarmCode, type Ringing } from '@/shared/alarms/catalog';
import { demoRigWide } from '@/shared/rig/demo-rigs';

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

/** What holds a run, the alarm that this is, and whom it rings at night (the table of the trade, no source). */
test.each<[string, AlarmCode, Ringing]>([
  ['unexpected-motion', 'unexpected-motion', 'always'],
  ['stopped-at-rig', 'unexpected-motion', 'always'],
  ['limit', 'limit', 'always'],
  ['interlock', 'interlock', 'always'],
  ['supply', 'supply', 'always'],
  ['controller-reset', 'controller-reset', 'always'],
  ['proof-failed', 'proof-failed', 'always'],
  ['table-slipped', 'home-edge', 'always'],
  ['slip-found-homing', 'home-edge', 'always'],
  ['no-deflection', 'no-deflection', 'always'],
  ['no-response', 'no-response', 'always'],
  ['excursion', 'excursion', 'always'],
  ['link-lost', 'held', 'always'],
  ['database-away', 'held', 'always'],
  ['server-restarted', 'held', 'always'],
  ['arm-ended', 'held', 'always'],
])('held for %s: the alarm %s, which rings %s and at once', (reasonCode, code, rings) => {
  const found = conditionsOf({ ...quiet, run: { ...running, state: 'held', reasonCode, reason: 'Why.' } });
  expect(found).toEqual([{ code, subject: '', words: 'Why.', runId: 'run', onDelayS: 0 }]);
  expect(alarmKinds[code].rings).toBe(rings);
});

test.each(['held-by-person', 'hold-after-dwell', 'stopped-by-person'])('%s is no alarm', (reasonCode) => {
  expect(codesOf({ run: { ...running, state: 'held', reasonCode } })).toEqual([]);
});

test('a run that cannot be carried on blocks its rig, and says so', () => {
  const quarantined = { runId: 'old', why: 'Another version wrote it.' };
  expect(conditionsOf({ ...quiet, quarantined })).toEqual([
    { code: 'not-taken-up', subject: '', words: 'Another version wrote it.', runId: 'old' },
  ]);
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

test('a dwell whose other of the pair was skipped by somebody is not held against the night', () => {
  const facts = {
    dwellsDone: 5,
    dwellsGood: 2,
    dwellsUnpaired: 0,
    dwellsPlanned: 8,
    lastDwellsAreGood: false,
    finishing: null,
    state: 'running',
    loud: null,
  } as unknown as RunFacts;
  const codes = (change: Partial<RunFacts>) =>
    conditionsOf({ ...quiet, run: runNowOf({ ...facts, ...change }, 420) }).map(({ code }) => code);
  expect(codes({})).toEqual(['few-good']);
  expect(codes({ dwellsUnpaired: 1 })).toEqual([]);
});

describe('the pendulum near its ends', () => {
  const words = (unit: string, extremes: { mean: number; least: number; greatest: number }, rig = demoRigWide) =>
    excursionWords(rig, { name: 'spot', unit }, extremes);

  test('in angles, from nine tenths of the nearer of clearance and range on', () => {
    expect(words('urad', { mean: 1000, least: -25_900, greatest: 2000 })).toBeNull();
    expect(words('urad', { mean: 1000, least: -26_100, greatest: 2000 })).toBe('The deflection reaches 27100 µrad of 30000 µrad.');
    expect(words('mrad', { mean: 1, least: 0, greatest: 28.1 })).toBe('The deflection reaches 27100 µrad of 30000 µrad.');
  });

  test('on the scale of a device, whichever way it counts; nothing is said without a lever, or where the rig tells no ends', () => {
    const { distance, fold } = demoRigWide.lever ?? { distance: { value: 0 }, fold: 0 };
    const mm = 1000 * distance.value * Math.tan(fold * 0.0275);
    expect(words('mm', { mean: 0, least: -mm, greatest: 5 })).toMatch(/reaches 27\d{3} µrad/);
    expect(words('mm', { mean: 0, least: -5, greatest: mm })).toMatch(/reaches 27\d{3} µrad/);
    const bare = { ...demoRigWide };
    delete bare.lever;
    expect(words('mm', { mean: 0, least: -mm, greatest: 5 }, bare)).toBeNull();
    const endless = { ...demoRigWide, pendulum: { ...demoRigWide.pendulum } };
    delete endless.readout;
    delete endless.pendulum.travel_rad;
    expect(words('rad', { mean: 0, least: -1, greatest: 1 }, endless)).toBeNull();
  });
});

test('a run that began within the hours of its room and will end outside of them; one that was begun outside on purpose is left alone', () => {
  const room = { hours: { nightWindow: { from: '21:00', until: '06:30' }, blackouts: [] }, timeZone: 'Europe/Zurich' };
  const at = (begins: string, ends: string) => lateWords({ startedAtUtcMs: Date.parse(begins), predictedEndUtcMs: Date.parse(ends) }, room);
  expect(at('2031-02-14T21:00:00Z', '2031-02-15T05:00:00Z')).toBeNull();
  expect(at('2031-02-14T21:00:00Z', '2031-02-15T06:00:00Z')).toContain('the night window of the room is 21:00 to 06:30');
  expect(at('2031-02-14T12:00:00Z', '2031-02-15T06:00:00Z')).toBeNull();
  expect(lateWords({ startedAtUtcMs: 0, predictedEndUtcMs: null }, room)).toBeNull();
});

test('a run is to be over by the end of its night window only where it was planned to be, and nobody has decided otherwise', () => {
  const room = { hours: { nightWindow: { from: '21:00', until: '06:30' }, blackouts: [] }, timeZone: 'Europe/Zurich' };
  const began = { startedAtUtcMs: Date.parse('2031-02-14T21:00:00Z'), finishing: null };
  const by = (planned: string, predicted: string | null, more = {}) =>
    finishByOf(
      { ...began, plannedEndUtcMs: Date.parse(planned), predictedEndUtcMs: predicted === null ? null : Date.parse(predicted), ...more },
      room,
    );
  expect(by('2031-02-15T05:00:00Z', '2031-02-15T05:20:00Z')).toBeNull();
  expect(by('2031-02-15T05:00:00Z', '2031-02-15T06:00:00Z')).toBe(Date.parse('2031-02-15T05:30:00Z'));
  expect(by('2031-02-15T05:40:00Z', '2031-02-15T06:00:00Z')).toBeNull();
  expect(by('2031-02-15T05:00:00Z', null)).toBeNull();
  const withdrawn = { by: '', askedUtcMs: 0, finishByUtcMs: 0, withdrawnBy: 'Ben' };
  expect(by('2031-02-15T05:00:00Z', '2031-02-15T06:00:00Z', { finishing: withdrawn })).toBeNull();
  // Over the night on which the clocks go forward: 06:30 comes an hour sooner.
  const march = { startedAtUtcMs: Date.parse('2031-03-29T21:00:00Z') };
  expect(by('2031-03-30T04:00:00Z', '2031-03-30T05:00:00Z', march)).toBe(Date.parse('2031-03-30T04:30:00Z'));
});

test('the list of alarms that users read names each, and whom it tells', () => {
  const tells: Record<Ringing, string> = { always: 'rings', allowed: 'rings', morning: 'in the morning', never: 'log' };
  const rows = readFileSync(join(__dirname, '../../../docs/alarms.md'), 'utf8').matchAll(
    /^\| ([^|]+) \|[^|]+\|[^|]+\| (rings|in the morning|log)\b/gm,
  );
  const told = Object.fromEntries([...rows].map(([, title, whom]) => [title, whom]));
  expect(told).toEqual(Object.fromEntries(alarmCodes.map((code) => [alarmKinds[code].title, tells[alarmKinds[code].rings]])));
});
