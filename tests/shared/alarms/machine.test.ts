import * as fc from 'fast-check';
import {
  advanceAlarm,
  alarmDueUtcMs,
  isHidden,
  isStanding,
  quietAlarm,
  shownState,
  type AlarmEvent,
  type AlarmFact,
  type AlarmRule,
  type AlarmSnapshot,
} from '@/shared/alarms/machine';

const rule = (change: Partial<AlarmRule> = {}): AlarmRule => ({
  onDelayS: 2,
  offDelayS: 3,
  latches: false,
  momentary: false,
  shelveAtMostMin: 60,
  ...change,
});

type Loose = { type: AlarmEvent['type'] } & Record<string, unknown>;

/** Plays events at seconds and returns what it came to. */
function play(events: readonly [number, Loose][], by: AlarmRule = rule()) {
  let alarm: AlarmSnapshot = quietAlarm;
  const facts: AlarmFact[] = [];
  const refusals: string[] = [];
  for (const [atS, event] of events) {
    const step = advanceAlarm(alarm, { by: 'Ilse', utcMs: 1000 * atS, ...event } as unknown as AlarmEvent, by);
    if (!step.ok) refusals.push(step.refusal);
    else {
      alarm = step.alarm;
      facts.push(...step.facts);
    }
  }
  return { alarm, facts, refusals, state: shownState(alarm) };
}

const met = { type: 'condition', met: true } as const;
const away = { type: 'condition', met: false } as const;
const tick = { type: 'tick' } as const;
const acknowledge = { type: 'acknowledge' } as const;

describe('the life of an alarm', () => {
  test('a condition shorter than the on-delay raises nothing; one that lasts does, once', () => {
    expect(
      play([
        [0, met],
        [1, away],
        [9, tick],
      ]),
    ).toMatchObject({ state: 'normal', facts: [] });
    expect(
      play([
        [0, met],
        [1.9, tick],
      ]),
    ).toMatchObject({ state: 'normal' });
    expect(
      play([
        [0, met],
        [2, tick],
        [5, met],
        [6, tick],
      ]),
    ).toMatchObject({ state: 'active-unacknowledged', facts: ['raised'] });
  });

  test('seen while it holds, it goes to normal when the condition has been away for the off-delay', () => {
    const story: [number, Loose][] = [
      [0, met],
      [2, tick],
      [4, acknowledge],
      [5, away],
      [7.9, tick],
    ];
    expect(play(story)).toMatchObject({ state: 'active-acknowledged' });
    expect(play([...story, [8, tick]])).toMatchObject({ state: 'normal', facts: ['raised', 'acknowledged', 'returned'] });
  });

  test('gone before anybody saw it, it waits for somebody to see it; back again it is still the same alarm', () => {
    const gone: [number, Loose][] = [
      [0, met],
      [2, tick],
      [4, away],
      [7, tick],
    ];
    expect(play(gone)).toMatchObject({ state: 'returned-unacknowledged' });
    expect(play([...gone, [9, acknowledge]])).toMatchObject({ state: 'normal' });
    expect(play([...gone, [9, met], [11, tick]]).alarm).toMatchObject({ state: 'active-unacknowledged', occurrence: 1 });
  });

  test('acknowledge, confirm and reset are three acts, in this order', () => {
    const latching = rule({ latches: true });
    const gone: [number, Loose][] = [
      [0, met],
      [2, tick],
      [3, acknowledge],
      [4, away],
      [7, tick],
    ];
    expect(play(gone, latching)).toMatchObject({ state: 'latched', facts: ['raised', 'acknowledged', 'returned', 'latched'] });
    const done = play([...gone, [8, { type: 'confirm', note: 'tightened' }], [9, { type: 'reset' }]], latching);
    expect(done).toMatchObject({ state: 'normal', alarm: { confirmed: { by: 'Ilse', note: 'tightened' } } });
    expect(
      play(
        [
          [0, met],
          [2, tick],
          [3, { type: 'confirm', note: '' }],
          [4, { type: 'reset' }],
        ],
        latching,
      ).refusals,
    ).toEqual(['not-acknowledged', 'not-latched']);
  });

  test('what happens in a moment stands until it is acknowledged', () => {
    const moment = rule({ momentary: true, onDelayS: 0 });
    expect(
      play(
        [
          [0, met],
          [900, tick],
        ],
        moment,
      ),
    ).toMatchObject({ state: 'active-unacknowledged' });
    expect(
      play(
        [
          [0, met],
          [900, acknowledge],
        ],
        moment,
      ),
    ).toMatchObject({ state: 'normal', alarm: { met: false, active: false } });
    expect(
      play(
        [
          [0, met],
          [900, acknowledge],
          [1000, met],
        ],
        moment,
      ).alarm.occurrence,
    ).toBe(2);
  });

  test('a shelf ends at its time and raises anew what still holds; a one-shot shelf ends with the condition', () => {
    const shelve: Loose = { type: 'shelve', reason: 'painters', untilUtcMs: 1_000_000, oneShot: false };
    const shelved: [number, Loose][] = [
      [0, met],
      [2, tick],
      [10, shelve],
    ];
    expect(play(shelved)).toMatchObject({ state: 'shelved' });
    expect(play([...shelved, [999, tick]])).toMatchObject({ state: 'shelved' });
    expect(play([...shelved, [1000, tick]]).alarm).toMatchObject({ state: 'active-unacknowledged', occurrence: 2 });
    const oneShot: [number, Loose][] = [
      [0, met],
      [2, tick],
      [10, { ...shelve, oneShot: true }],
      [20, away],
      [23, tick],
    ];
    expect(play(oneShot)).toMatchObject({ state: 'normal', alarm: { shelf: null } });
    expect(
      play([
        [0, tick],
        [1, { ...shelve, untilUtcMs: 3_601_001 }],
      ]),
    ).toMatchObject({ refusals: ['shelved-too-long'] });
  });

  test('suppressed or out of service it tells nothing, and tells when it is back if the condition holds', () => {
    expect(
      play([
        [0, { type: 'suppress', why: 'Ilse works at the rig' }],
        [1, met],
        [5, tick],
      ]),
    ).toMatchObject({
      state: 'suppressed',
      facts: ['suppressed'],
    });
    const out: [number, Loose][] = [
      [0, { type: 'take-out', reason: 'no sensor' }],
      [1, met],
      [5, tick],
    ];
    expect(play(out)).toMatchObject({ state: 'out-of-service', facts: ['taken-out'] });
    expect(play([...out, [9, { type: 'return-to-service' }]])).toMatchObject({ facts: ['taken-out', 'returned-to-service', 'raised'] });
  });
});

const eventArbitrary = fc.oneof(
  { weight: 4, arbitrary: fc.boolean().map((is): Loose => ({ type: 'condition', met: is })) },
  { weight: 4, arbitrary: fc.constant<Loose>(tick) },
  fc.constantFrom<Loose>(acknowledge, { type: 'reset' }, { type: 'unshelve' }, { type: 'unsuppress' }, { type: 'return-to-service' }),
  fc.constantFrom<Loose>({ type: 'confirm', note: '' }, { type: 'suppress', why: 'x' }, { type: 'take-out', reason: 'xyz' }),
  fc
    .tuple(fc.integer({ min: -5, max: 4000 }), fc.boolean())
    .map(([forS, oneShot]): Loose => ({ type: 'shelve', reason: 'xyz', forS, oneShot })),
);
const storyArbitrary = fc.record({
  rule: fc.record({
    onDelayS: fc.integer({ min: 0, max: 20 }),
    offDelayS: fc.integer({ min: 0, max: 20 }),
    latches: fc.boolean(),
    momentary: fc.boolean(),
    shelveAtMostMin: fc.constant(60),
  }),
  steps: fc.array(fc.tuple(fc.integer({ min: 0, max: 40 }), eventArbitrary), { maxLength: 40 }),
});

test('whatever happens in whatever order: what is told and shown is always true', () => {
  fc.assert(
    fc.property(storyArbitrary, ({ rule: by, steps }) => {
      let alarm: AlarmSnapshot = quietAlarm;
      let nowMs = 0;
      for (const [pauseS, { forS, ...loose }] of steps) {
        nowMs += 1000 * pauseS;
        const event = { by: 'Ilse', utcMs: nowMs, untilUtcMs: nowMs + 1000 * Number(forS ?? 0), ...loose } as unknown as AlarmEvent;
        const before = structuredClone(alarm);
        const step = advanceAlarm(alarm, event, by);
        expect(alarm).toEqual(before);
        if (!step.ok) continue;
        const { facts } = step;
        alarm = step.alarm;
        // Nothing hidden stands; an unacknowledged state has nobody who acknowledged it in this occurrence.
        expect(isStanding(alarm) && isHidden(alarm)).toBe(false);
        if (isHidden(alarm)) expect(['normal', 'latched']).toContain(alarm.state);
        // Each raising is a new occurrence, told once, and only of a condition that holds and is not hidden.
        expect(alarm.occurrence - before.occurrence).toBe(facts.filter((fact) => fact === 'raised').length);
        if (!isHidden(alarm) && alarm.active) expect(['active-unacknowledged', 'active-acknowledged']).toContain(alarm.state);
        if (alarm.state === 'active-acknowledged') expect(alarm.acknowledged).not.toBeNull();
        if (alarm.state === 'active-unacknowledged' && event.type !== 'acknowledge') expect(alarm.active).toBe(true);
        // Latched only where the rule says so, and never forgotten without a reset.
        if (alarm.state === 'latched') expect(by.latches).toBe(true);
        if (before.state === 'latched' && alarm.state === 'normal') expect(facts).toContain('reset');
        // No shelf outlasts its time or its maximum.
        if (alarm.shelf !== null) expect(alarm.shelf.untilUtcMs).toBeGreaterThan(nowMs);
        // Time alone does nothing before the instant that was named, and there it does something.
        const due = alarmDueUtcMs(alarm, by);
        const idle = advanceAlarm(alarm, { type: 'tick', utcMs: due === null ? nowMs + 1e9 : due - 1 }, by);
        if (due === null || due > nowMs) expect(idle).toEqual({ ok: true, alarm, facts: [] });
        if (due !== null) {
          const woken = advanceAlarm(alarm, { type: 'tick', utcMs: due }, by);
          expect(woken.ok && JSON.stringify(woken.alarm) !== JSON.stringify(alarm)).toBe(true);
        }
      }
    }),
    { numRuns: 200 },
  );
});
