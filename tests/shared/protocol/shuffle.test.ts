import * as fc from 'fast-check';
import { checkProtocol } from '@/shared/protocol/check';
import { advanceCursor, beginCursor, type PlannedItem } from '@/shared/protocol/cursor';
import type { RepeatStep, Step } from '@/shared/protocol/document';
import type { PassOrder } from '@/shared/protocol/shuffle';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

/** Repeats whose children come in an order that is drawn anew in each pass. */

const mark = (label: string): Step => ({ kind: 'mark', label });
const once = (...steps: Step[]): RepeatStep => ({ kind: 'repeat', times: 1, steps });
const shuffled = (times: number, ...steps: Step[]): RepeatStep => ({ kind: 'repeat', times, order: 'shuffled', steps });
const letters = (count: number) => Array.from({ length: count }, (_, index) => once(mark(String.fromCharCode(97 + index))));

/** All that is executed, and what was told of orders with each step; the cursor goes through JSON at every step, as in a run that is restarted. */
function run(steps: Step[], shuffleSeed: number, stepS = 1): { items: PlannedItem[]; drawn: (PassOrder & { before: string })[] } {
  const plan = { protocol: { steps }, rig: demoRigWide, timeZone: 'UTC', shuffleSeed };
  const items: PlannedItem[] = [];
  const drawn: (PassOrder & { before: string })[] = [];
  let cursor = beginCursor();
  for (;;) {
    const next = advanceCursor(plan, cursor, { utcMs: 1000 * stepS * items.length, angleDeg: 0 });
    if (next.item === null) return { items, drawn };
    const { path } = next.item;
    drawn.push(...(next.drawn ?? []).map((pass) => ({ ...pass, before: path })));
    items.push(next.item);
    cursor = JSON.parse(JSON.stringify(next.cursor)) as typeof cursor;
  }
}
const labelsOf = (items: readonly PlannedItem[]) => items.map(({ step }) => step.label ?? '').join('');

test('each pass has each child once, by its number in the document, in the order that was told before', () => {
  fc.assert(
    fc.property(fc.integer({ min: 2, max: 6 }), fc.integer({ min: 1, max: 5 }), fc.nat(), (count, times, seed) => {
      const { items, drawn } = run([shuffled(times, ...letters(count))], seed);
      expect(items).toHaveLength(count * times);
      expect(drawn.map(({ path }) => path)).toEqual(Array.from({ length: times }, (_, pass) => `1.repeat[${pass + 1}]`));
      for (const [pass, { order, before }] of drawn.entries()) {
        const own = items.slice(pass * count, (pass + 1) * count);
        expect(own.map(({ path }) => path)).toEqual(order.map((number) => `1.repeat[${pass + 1}].${number}.repeat[1].1.mark`));
        expect(before).toBe(own[0]?.path);
        expect(labelsOf(own)).toBe(order.map((number) => String.fromCharCode(96 + number)).join(''));
        expect([...order].sort()).toEqual(Array.from({ length: count }, (_, index) => index + 1));
      }
    }),
    { numRuns: 40 },
  );
});

test('the same seed gives the same orders; all orders are about as frequent', () => {
  const three = [shuffled(600, ...letters(3))];
  const { drawn } = run(three, 7);
  expect(run(three, 7).drawn).toEqual(drawn);
  expect(run(three, 8).drawn).not.toEqual(drawn);
  const counts = new Map<string, number>();
  for (const { order } of drawn) counts.set(order.join(''), (counts.get(order.join('')) ?? 0) + 1);
  expect(counts.size).toBe(6);
  // 100 each are expected, with a standard deviation of 9.
  for (const count of counts.values()) expect(Math.abs(count - 100)).toBeLessThan(36);
});

test.each([2, 4])('no order hangs on that of the pass before, nor on how many passes ago it was: %d children', (count) => {
  const passes = 600;
  const orders = run([shuffled(passes, ...letters(count))], 7).drawn.map(({ order }) => order);
  const kinds = count === 2 ? 2 : 24;
  for (const lag of [1, 2, 3, 4, 10]) {
    // Binomial: 600 draws, each with the chance 1/kinds; four standard deviations and a half.
    const pairs = passes - lag;
    const same = orders.slice(lag).filter((order, pass) => order.join('') === orders[pass]?.join('')).length;
    const chance = 1 / kinds;
    expect(Math.abs(same - pairs * chance)).toBeLessThan(4.5 * Math.sqrt(pairs * chance * (1 - chance)));
  }
});

test('the first passes of two children come in as many ways as there are', () => {
  const eight = Array.from({ length: 64 }, (_, seed) =>
    run([shuffled(8, ...letters(2))], seed)
      .drawn.map(({ order }) => order[0])
      .join(''),
  );
  // 64 draws of 256: 57 different ones are expected, with a standard deviation of about 2.5.
  expect(new Set(eight).size).toBeGreaterThan(44);
});

test('nested: the inner one draws anew in each pass of the outer, and both are told before the first step', () => {
  const { drawn, items } = run([shuffled(4, shuffled(2, ...letters(3)), once(mark('z')))], 3);
  expect(items).toHaveLength(4 * 7);
  const inner = drawn.filter(({ path }) => path.includes('.1.repeat'));
  expect(inner).toHaveLength(8);
  expect(new Set(inner.map(({ order }) => order.join(''))).size).toBeGreaterThan(2);
  const outerFirst = drawn.findIndex(({ path, order }) => path === '1.repeat[1]' && order[0] === 1);
  if (outerFirst >= 0) expect(drawn[outerFirst + 1]?.before).toBe(drawn[outerFirst]?.before);
});

test('until a time: a pass begins only if it ends in time in the order that it will have', () => {
  const block = (seconds: number) => once({ kind: 'settle', for_s: seconds });
  const plan = {
    protocol: { steps: [{ ...shuffled(1, block(100), block(200)), times: undefined, until: { localTime: '00:10' } }] as Step[] },
    ...{ rig: demoRigWide, timeZone: 'UTC', shuffleSeed: 1 },
  };
  const at = (utcMs: number) => advanceCursor(plan, beginCursor(), { utcMs, angleDeg: 0 }).item?.step;
  expect(at(300_000)).toMatchObject({ kind: 'settle' });
  expect(at(301_000)).toBeUndefined();
});

describe('what is refused', () => {
  const check = (steps: Step[], rig: RigDocument = demoRigWide) =>
    checkProtocol({ formatVersion: 1, name: 'Shuffled', steps }, rig).map(({ code, path }) => `${code} ${path}`);
  const near: Step = { kind: 'swing', to: 'near' };
  const far: Step = { kind: 'swing', to: 'far' };
  const dwell: Step = { kind: 'dwell', for_s: 600 };
  const home: Step = { kind: 'home' };

  test('a child that is no repeat', () => {
    expect(check([home, shuffled(2, once(near, dwell), dwell)])).toEqual(['shuffle-needs-repeats 2.repeat']);
    expect(check([home, shuffled(2, once(near, dwell), once(far, dwell))])).toEqual([]);
  });

  test('a way that some order would take through a keep-out arc, though that as written does not', () => {
    const steps = (order: Step[]) => [home, near, { kind: 'repeat', times: 1, order: 'shuffled', steps: order } as Step];
    const arc = { ...demoRigWide, motion: { ...demoRigWide.motion, keepOut: [[60, 80]] } } as RigDocument;
    const to = (angle: number): Step => once({ kind: 'swing', to: { angle_deg: angle } }, dwell);
    expect(check(steps([to(40), to(10)]), arc)).toEqual([]);
    expect(check([home, { kind: 'swing', to: { angle_deg: 90 } }, shuffled(1, to(100), to(40))], arc)).toContain(
      'keep-out 3.repeat.2.repeat.1.swing',
    );
    expect(check([home, { kind: 'swing', to: { angle_deg: 40 } }, shuffled(1, to(50), to(40), to(90))], arc)).toEqual(
      expect.arrayContaining(['keep-out 3.repeat.1.repeat.1.swing', 'keep-out 3.repeat.3.repeat.1.swing']),
    );
  });

  test('a proof whose pair may come after it', () => {
    const proof: Step = { kind: 'proof' };
    const pair = [near, dwell, far, dwell];
    expect(check([home, shuffled(1, once(...pair), once(proof))])).toEqual(['proof-needs-pair 2.repeat.2.repeat.1.proof']);
    expect(check([home, ...pair, shuffled(1, once(...pair), once(proof))])).toEqual([]);
    expect(check([home, shuffled(1, once(...pair, proof), once(far, dwell))])).toEqual([]);
  });

  test('a proof whose pair stands on the same side in some order, because a child finds the sources where another has left them', () => {
    const proof: Step = { kind: 'proof' };
    const swings = (...blocks: RepeatStep[]) => check([home, near, dwell, shuffled(1, ...blocks), proof]);
    expect(swings(once(far), once(dwell))).toEqual(['proof-needs-pair 5.proof']);
    expect(swings(once(dwell), once(far))).toEqual(['proof-needs-pair 5.proof']);
    expect(swings(once(far, dwell), once(dwell))).toEqual([]);
    const after = (...blocks: RepeatStep[]) => check([home, near, dwell, shuffled(1, ...blocks), dwell, proof]);
    expect(after(once(near), once(far))).toEqual(['proof-needs-pair 6.proof']);
    expect(after(once(near, far), once(far))).toEqual([]);
    // Nothing in it moves: the far dwell is one in every order.
    expect(check([home, near, dwell, far, shuffled(1, once(dwell), once(mark('x'))), proof])).toEqual([]);
  });

  test('more children than each can be looked at after each of the others, those of inner ones counted too', () => {
    const many = (count: number, order: RepeatStep['order']): RepeatStep => ({ ...shuffled(2, ...letters(count)), order });
    expect(check([home, many(24, 'shuffled')])).toEqual([]);
    expect(check([home, many(25, 'shuffled')])).toEqual(['too-many-children 2.repeat']);
    expect(check([home, many(25, 'as written')])).toEqual([]);
    expect(check([home, shuffled(1, many(22, 'shuffled'), once(dwell))])).toEqual([]);
    expect(check([home, shuffled(1, many(23, 'shuffled'), once(dwell))])).toEqual(['too-many-children 2.repeat']);
    const [finding] = checkProtocol({ formatVersion: 1, name: 'Many', steps: [home, many(3000, 'shuffled')] }, demoRigWide);
    expect(finding?.message).toMatch(/up to 24 repeats.* these are 3000/);
  });

  test('in a single pass no child follows itself', () => {
    const beat: Step = { kind: 'dwell', beat_periods: 2 };
    // Its beat counts from the swing before the repeat; what it ends with is none.
    const first = once(beat, { kind: 'settle', for_s: 60 });
    const swings = once(beat, near);
    expect(check([home, near, shuffled(1, swings)])).toEqual([]);
    expect(check([home, near, shuffled(2, swings)])).toEqual([]);
    expect(check([home, near, shuffled(1, first)])).toEqual([]);
    expect(check([home, near, shuffled(2, first)])).toEqual(['beat-needs-swing 3.repeat.1.repeat.1.dwell']);
  });
});
