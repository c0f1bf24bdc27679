import { alarmKinds } from '@/shared/alarms/catalog';
import type { ChainedEvent, StepRow } from '@/shared/archive/run-records';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { NARROW_SPACE } from '@/shared/lib/format-number';
import { morningSheet as sheetOf, type MorningFacts } from '@/shared/morning/sheet';
import * as words from '@/shared/morning/words';
import { predictSignal } from '@/shared/protocol/predict';
import { demoRigWide } from '@/shared/rig/demo-rigs';

/** A night worked out by hand: home, then dwells of 30 min with swings of 1 min between them, from 22:00 UTC on. */

/** Numbers and units stand apart by narrow spaces, which nobody could tell from others here. */
const plain = <T>(value: T): T => JSON.parse(JSON.stringify(value).replaceAll(NARROW_SPACE, ' ')) as T;
const morningSheet = (facts: MorningFacts) => plain(sheetOf(facts));
const dwellWords = (sheet: Parameters<typeof words.dwellWords>[0]) => plain(words.dwellWords(sheet));
const morningLines = (...of: Parameters<typeof words.morningLines>) => plain(words.morningLines(...of));
const planWords = (...of: Parameters<typeof words.planWords>) => plain(words.planWords(...of));

const start = Date.parse('2031-03-14T22:00:00Z');
const min = 60_000;
const predictedRad = predictSignal(demoRigWide)?.signalRad ?? NaN;

const row = (seq: number, part: Partial<StepRow> & Pick<StepRow, 'kind'>, fromMin: number, toMin: number): StepRow => ({
  ...{ seq, path: String(seq), label: '', station: '', plannedStartUtcMs: start + fromMin * min, plannedEndUtcMs: start + toMin * min },
  ...{ startUtcMs: start + fromMin * min, endUtcMs: start + toMin * min, uStartS: 0, uEndS: 0, angleStartDeg: 0, angleEndDeg: 0 },
  ...{ outcome: 'done', angleSource: 'edge-verified', uAngleDeg: 0.01, good: part.kind === 'dwell' ? true : null },
  ...part,
});
const event = (seq: number, atMin: number, kind: string, data: Record<string, unknown> = {}): ChainedEvent => ({
  ...{ seq, at: new Date(start + atMin * min).toISOString(), kind, data, prev: '', hash: '' },
});

const rows = [
  row(1, { kind: 'home' }, 0, 2),
  row(2, { kind: 'dwell', station: 'near' }, 2, 32),
  row(3, { kind: 'swing', station: 'far' }, 32, 33),
  row(4, { kind: 'dwell', station: 'far', good: false }, 33, 63),
  row(5, { kind: 'swing', station: 'near' }, 63, 64),
  row(6, { kind: 'dwell', station: 'near', outcome: 'cut short', good: false }, 64, 74),
  row(7, { kind: 'dwell', station: 'near' }, 94, 124),
];
const events = [
  event(1, 0, 'run-started'),
  event(2, 0.5, 'home-edge', { angleDeg: 0, direction: 'ccw', offDeg: 0 }),
  event(3, 32.5, 'home-edge', { angleDeg: 0.01, slipDeg: 0.01, proved: true }),
  event(4, 63, 'dwell-not-good', { seq: 4, why: ['deflection silent for 90 s, more than 60 s'] }),
  event(5, 74, 'held', { code: 'interlock', reason: 'The door was opened.' }),
  event(6, 94, 'resumed', { by: 'Anna' }),
  event(7, 124, 'finished', { dwells: 4 }),
];

const G = 6.674e-11;
const line = (input: string, share: number) => ({ input, value: 1, u: 0.01, sensitivity: 1, contribution: 0, share });
const result: EvaluationResult = {
  formatVersion: 1,
  ...{ method: 'equilibrium', registered: true, chain: { events: 7, valid: true } },
  alignment: { clockOffset_s: { value: 1.25, u: 0.1 }, applied: true },
  ...{ period_s: { value: 600, u: 1 }, decayTime_s: { value: 2000, u: 20 }, kappa_N_m: null, dwells: [] },
  reversal_rad: { value: 0.95 * predictedRad, u: 0.01 * predictedRad, count: 2 },
  ...{ G: { value: G, u: 0.01 * G, degreesOfFreedom: 5 }, relativeU: 0.01, codata: { value: G, u: 1e-15, En: 0 } },
  budget: [line('reversal_rad', 0.2), line('period_s', 0.08), line('sources.orbit', 0.64), line('pendulum.arm', 0.08)],
  ...{ monteCarlo: null, warnings: [] },
};

const night: MorningFacts = {
  ...{
    runId: 'run-1',
    rig: demoRigWide,
    startedAtUtcMs: start,
    endUtcMs: start + 124 * min,
    rows,
    events,
    result,
    failure: null,
    earlier: [],
  },
  plan: { endUtcMs: start + 104 * min, dwells: 4, truncated: false },
  record: { events: 7, brokenAt: null },
  room: [],
  cover: { channel: 'spot', samples: 9_950, expected: 10_000, longestGapS: 90 },
};
const tick = (facts: Partial<MorningFacts>, code: string) => morningSheet({ ...night, ...facts }).ticks.find((one) => one.code === code);

test('good dwells of those planned, and every minute without a result by its cause', () => {
  const sheet = morningSheet(night);
  expect(sheet.dwells).toEqual({ planned: 4, done: 3, good: 2 });
  // 30 min silent and 10 min cut short; 20 min held for the door.
  expect(sheet.lost).toEqual([
    { words: 'dwells that do not count', s: 2400 },
    { words: 'held: interlock or door opened', s: 1200 },
  ]);
  expect(sheet.worst.map(({ seq, s }) => [seq, s])).toEqual([
    [4, 1800],
    [6, 1800],
  ]);
  expect(sheet.worst[0]?.words).toBe('deflection silent for 90 s, more than 60 s');
  expect(dwellWords(sheet)).toBe(
    '2 of 4 dwells are good; 1 h brought nothing that counts: dwells that do not count 40 min, held: interlock or door opened 20 min',
  );
});

test('an interruption that the run overcame by itself counts from the last word that all was well; a hold that lasts, until now', () => {
  const overcome = event(5, 80, 'resumed', { by: 'protocol', cause: 'link-lost', gapS: 300 });
  expect(morningSheet({ ...night, rows: rows.slice(0, 2), events: [overcome] }).lost).toEqual([
    { words: 'link to the controller lost', s: 300 },
  ]);
  const held = [event(1, 60, 'held', { code: 'held-by-person', reason: 'Anna held it.' })];
  expect(morningSheet({ ...night, rows: rows.slice(0, 2), events: held }).lost).toEqual([{ words: 'held by a person', s: 3840 }]);
});

test('an interruption that a dwell outlived is no time lost beside it', () => {
  const within = event(5, 120, 'resumed', { by: 'protocol', cause: 'link-lost', gapS: 300 });
  expect(morningSheet({ ...night, events: [within] }).lost.map(({ words }) => words)).toEqual(['dwells that do not count']);
});

test('a control has nothing predicted, and is told as one', () => {
  const control = { ...demoRigWide, sources: { shape: 'none' as const } };
  expect(tick({ rig: control }, 'first-pair')).toEqual({ code: 'first-pair', ok: null, words: expect.stringMatching(/^A control/) });
});

test('the five ticks of an ordinary night, each with its figure', () => {
  expect(morningSheet(night).ticks).toEqual([
    { code: 'first-pair', ok: true, words: 'Near − far 5.0 % below the prediction, u 1.0 %' },
    { code: 'edge', ok: true, words: expect.stringMatching(/^Home edge moved 0\.010°, 0\.\d{3}° allowed$/) },
    { code: 'samples', ok: true, words: '99.5 % of the samples, longest gap 1 min 30 s' },
    { code: 'clock', ok: true, words: 'Clock off by 1.25(10) s, put right' },
    { code: 'record', ok: true, words: 'Chain of 7 events whole, as registered' },
  ]);
});

test('how far near minus far is off has no u where the night gives none, or where G is told otherwise', () => {
  for (const other of [{ relativeU: null }, { method: 'acceleration' as const }])
    expect(tick({ result: { ...result, ...other } }, 'first-pair')?.words).toBe('Near − far 5.0 % below the prediction, u not known');
});

test('what speaks against the night is no tick', () => {
  const small = { ...result, reversal_rad: { value: 0.7 * predictedRad, u: 1e-6, count: 2 } };
  expect(tick({ result: small }, 'first-pair')).toMatchObject({
    ok: false,
    words: expect.stringContaining('30 % below the prediction, u 1.0 %, 20 % allowed'),
  });
  const turned = { ...result, reversal_rad: { value: -predictedRad, u: 1e-6, count: 2 } };
  expect(tick({ result: turned }, 'first-pair')?.ok).toBe(false);
  const proof = event(8, 60, 'proof', { sound: false, tests: [{ test: 'sign', ok: false, words: 'near and far are on the wrong sides' }] });
  expect(tick({ events: [...events, proof] }, 'first-pair')).toMatchObject({ ok: false, words: expect.stringContaining('wrong sides') });
  const slip = event(8, 60, 'table-slipped', { slipDeg: -0.4 });
  expect(tick({ events: [...events, slip] }, 'edge')).toMatchObject({ ok: false, words: 'The table slipped by 0.40°' });
  expect(tick({ cover: { ...night.cover!, samples: 9_800 } }, 'samples')?.ok).toBe(false);
  expect(tick({ record: { events: 7, brokenAt: 5 } }, 'record')).toMatchObject({ ok: false, words: expect.stringContaining('event 5') });
  expect(tick({ result: { ...result, registered: false } }, 'record')?.ok).toBe(false);
});

test('what cannot be told is neither right nor wrong', () => {
  expect(morningSheet({ ...night, result: null, cover: null, events: events.slice(0, 1) }).ticks.map(({ ok }) => ok)).toEqual([
    ...[null, null, null, null, true],
  ]);
});

test('what the next night brings, and what measuring the rig brings, from the budget', () => {
  const { next, shares } = morningSheet({ ...night, events: events.slice(0, 4) });
  expect(shares?.night).toBeCloseTo(0.28, 12);
  expect(shares?.geometry).toBeCloseTo(0.72, 12);
  // 1 % √(1 − 3/4 · 0.64) = 0.721 %; 1 % √(1 − 0.28 / 2) = 0.927 %.
  expect(next).toEqual([
    { act: 'first', words: 'Measure the orbit of the sources twice as well: that takes u(G)/G from 1.0 % to 0.72 %.' },
    { act: 'go', words: 'Go: a second night like this one takes u(G)/G from 1.0 % to 0.93 %.' },
  ]);
});

test('where the geometry has nearly all of u(G), another night is not praised', () => {
  const budget = [line('reversal_rad', 0.005), line('sources.orbit', 0.995)];
  expect(morningSheet({ ...night, events: events.slice(0, 4), result: { ...result, budget } }).next[1]).toEqual({
    act: 'go',
    words: 'Another night like this one hardly makes u(G)/G smaller: the geometry has 100 % of its square.',
  });
});

test('what held the run last is to be put right, unless somebody has resumed it; why an evaluation failed is told', () => {
  const held = morningSheet({ ...night, events: events.slice(0, 5) }).next[0]?.words;
  expect(held).toBe(alarmKinds.interlock.answer);
  expect(morningSheet({ ...night, events: events.slice(0, 6) }).next.map(({ words }) => words)).not.toContain(held);
  const failed = morningSheet({ ...night, result: null, failure: 'channels/spot.csv: no dwell has samples' });
  expect(failed.next[0]?.words).toMatch(/^The evaluation failed: channels\/spot\.csv: no dwell has samples\./);
});

test('what shares its error with others is not to be measured alone', () => {
  const { sources } = demoRigWide;
  const grouped = { ...demoRigWide, sources: { ...sources, orbit: { ...sources.orbit!, group: 'ruler' } } };
  expect(morningSheet({ ...night, rig: grouped, events: events.slice(0, 4) }).next.map(({ act }) => act)).toEqual(['go']);
});

test('faults come first, and half of the dwells lost says wait', () => {
  const lost = rows.map((one) => (one.kind === 'dwell' ? { ...one, outcome: 'done' as const, good: one.seq === 2 } : one));
  const { next } = morningSheet({ ...night, rows: lost, cover: { ...night.cover!, samples: 5_000 } });
  expect(next.map(({ act }) => act)).toEqual(['first', 'wait', 'first']);
  expect(next[0]?.words).toMatch(/^50\.0 % of the samples/);
  expect(next[1]?.words).toMatch(/^3 of 4 dwells do not count, the last for: deflection silent/);
});

test('the mail has them in the order in which people ask, each number with its unit and its u', () => {
  const lines = morningLines(morningSheet(night), {
    ...{ state: 'Finished', endedAt: new Date(night.endUtcMs).toISOString(), reason: '', timeZone: 'Europe/Zurich' },
  });
  expect(lines[0]).toBe('Finished 01:04 Sat, Europe/Zurich, 20 min after the plan.');
  expect(lines[1]).toMatch(/^May I go in\?/);
  expect(lines.slice(2, 7).every((words) => words.startsWith('✓ '))).toBe(true);
  expect(lines[8]).toMatch(/^Near − far: .+\(\d+\) mrad\.$/);
  expect(lines[9]).toMatch(/^G: 6\.674\(67\)\s×\s10⁻¹¹\sm³\skg⁻¹\ss⁻², standard uncertainty 1\.0\s%\.$/);
});

test('two minutes off the plan are as planned; an open end has no plan', () => {
  const plannedEndAt = '2031-03-15T05:00:00.000Z';
  expect(planWords({ plannedEndAt }, '2031-03-15T05:01:59.000Z')).toBe('as planned');
  expect(planWords({ plannedEndAt }, '2031-03-15T04:30:00.000Z')).toBe('30 min before the plan');
  expect(planWords({ plannedEndAt: null }, '2031-03-15T04:30:00.000Z')).toBe('');
});
