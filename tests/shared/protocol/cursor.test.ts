import * as fc from 'fast-check';
import { advanceCursor, beginCursor, type CursorState, type PlannedItem } from '@/shared/protocol/cursor';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { documents } from './arbitraries';

const planOf = (protocol: Pick<ProtocolDocument, 'steps' | 'atEnd'>, timeZone = 'UTC') => ({ protocol, rig: demoRigWide, timeZone });

/** Runs the cursor to its end; each step is said to end `secondsPerStep` after the one before. */
function run(protocol: Pick<ProtocolDocument, 'steps' | 'atEnd'>, { startUtcMs = 0, secondsPerStep = 0 } = {}): PlannedItem[] {
  const items: PlannedItem[] = [];
  let cursor = beginCursor();
  for (;;) {
    const next = advanceCursor(planOf(protocol), cursor, { utcMs: startUtcMs + items.length * secondsPerStep * 1000, angleDeg: 0 });
    if (next.item === null) return items;
    items.push(next.item);
    cursor = next.cursor;
  }
}

/** The plainest reading of the format, written without regard to the cursor: lists unrolled by recursion. */
function unrolled(steps: readonly Step[], before = ''): { path: string; step: Step }[] {
  return steps.flatMap((step, index) => {
    if (step.kind !== 'repeat') return [{ path: `${before}${index + 1}.${step.kind}`, step }];
    return Array.from({ length: step.times ?? 0 }, (_, pass) => unrolled(step.steps, `${before}${index + 1}.repeat[${pass + 1}].`)).flat();
  });
}

const mark = (label: string): Step => ({ kind: 'mark', label });

test('executes the steps one after another and then is finished', () => {
  expect(run({ steps: [{ kind: 'home' }, mark('a'), mark('b')] }).map(({ path }) => path)).toEqual(['1.home', '2.mark', '3.mark']);
});

test('counts passes from 1 in the path of the run and leaves them out of the path in the document', () => {
  const items = run({
    steps: [{ kind: 'home' }, { kind: 'repeat', times: 2, steps: [mark('a'), { kind: 'repeat', times: 2, steps: [mark('b')] }] }],
  });
  expect(items.map(({ path }) => path)).toEqual([
    '1.home',
    '2.repeat[1].1.mark',
    '2.repeat[1].2.repeat[1].1.mark',
    '2.repeat[1].2.repeat[2].1.mark',
    '2.repeat[2].1.mark',
    '2.repeat[2].2.repeat[1].1.mark',
    '2.repeat[2].2.repeat[2].1.mark',
  ]);
  expect(items.at(-1)?.documentPath).toBe('2.repeat.2.repeat.1.mark');
});

test('what is executed equals an independent unrolling of the document', () => {
  fc.assert(
    fc.property(documents, (document) => {
      const expected = unrolled(document.steps).map(({ path, step }) => ({ path, step }));
      if (document.atEnd?.station !== undefined)
        expected.push({ path: 'atEnd.swing', step: { kind: 'swing', to: document.atEnd.station } });
      expect(run(document).map(({ path, step }) => ({ path, step }))).toEqual(expected);
    }),
  );
});

test('a cursor that went through JSON carries on as if nothing had happened', () => {
  fc.assert(
    fc.property(documents, fc.nat(60), (document, stop) => {
      const moment = { utcMs: 0, angleDeg: 0 };
      const plan = planOf(document);
      let plain: CursorState = beginCursor();
      let stored: CursorState = beginCursor();
      for (let index = 0; index < stop; index += 1) {
        const left = advanceCursor(plan, plain, moment);
        const right = advanceCursor(plan, JSON.parse(JSON.stringify(stored)) as CursorState, moment);
        expect(right).toEqual(left);
        [plain, stored] = [left.cursor, right.cursor];
      }
    }),
  );
});

test('looking ahead changes nothing', () => {
  const plan = planOf({ steps: [{ kind: 'repeat', times: 3, steps: [mark('a')] }] });
  const cursor = advanceCursor(plan, beginCursor(), { utcMs: 0, angleDeg: 0 }).cursor;
  const before = JSON.stringify(cursor);
  advanceCursor(plan, cursor, { utcMs: 0, angleDeg: 0 });
  expect(JSON.stringify(cursor)).toBe(before);
});

test('the sources go to the station of atEnd last, once', () => {
  const items = run({ steps: [mark('a')], atEnd: { station: 'clear', drivers: 'keep' } });
  expect(items.map(({ path, step }) => [path, step])).toEqual([
    ['1.mark', mark('a')],
    ['atEnd.swing', { kind: 'swing', to: 'clear' }],
  ]);
});

describe('repeat until a local time', () => {
  const until = (localTime: string, steps: Step[]): Step[] => [{ kind: 'repeat', until: { localTime }, steps }];
  const settle = (for_s: number): Step => ({ kind: 'settle', for_s });

  test('a pass that would end exactly at the time still starts, one that would end later does not', () => {
    // From 00:00:00, passes of 1800 s until 02:00: four end by 02:00:00, the fourth exactly then.
    expect(run({ steps: until('02:00', [settle(1800)]) }, { secondsPerStep: 1800 })).toHaveLength(4);
    expect(run({ steps: until('02:00', [settle(1801)]) }, { secondsPerStep: 1801 })).toHaveLength(3);
  });

  test('a stamp that is some microseconds off the plan costs no pass', () => {
    const late = Date.UTC(2000, 0, 1) + 0.003;
    expect(run({ steps: until('02:00', [settle(1800)]) }, { startUtcMs: late, secondsPerStep: 1800 })).toHaveLength(4);
  });

  test('atMost bounds the passes, here and in a repeat with times', () => {
    const bounded = (step: Partial<Extract<Step, { kind: 'repeat' }>>): Step[] => [{ kind: 'repeat', steps: [settle(600)], ...step }];
    expect(run({ steps: bounded({ until: { localTime: '02:00' }, atMost: 3 }) }, { secondsPerStep: 600 })).toHaveLength(3);
    expect(run({ steps: bounded({ times: 5, atMost: 3 }) }, { secondsPerStep: 600 })).toHaveLength(3);
    expect(run({ steps: bounded({ times: 2, atMost: 3 }) }, { secondsPerStep: 600 })).toHaveLength(2);
  });

  test('no pass at all is allowed', () => {
    expect(run({ steps: [...until('00:10', [settle(1800)]), mark('after')] }).map(({ path }) => path)).toEqual(['2.mark']);
  });

  test('the time is fixed when the repeat begins: past it, the next day is not meant', () => {
    // Each step really takes 5000 s where 1800 s were planned: the second pass begins at 5000 s, the third would at 10000 s > 02:00.
    expect(run({ steps: until('02:00', [settle(1800)]) }, { secondsPerStep: 5000 })).toHaveLength(2);
  });

  test('a time that is already over today means tomorrow', () => {
    const items = run({ steps: until('06:30', [settle(3600)]) }, { startUtcMs: Date.UTC(2031, 2, 13, 22), secondsPerStep: 3600 });
    expect(items).toHaveLength(8);
  });

  test('the planned end of a pass counts moves from where the sources stand', () => {
    // 0 to 90 deg takes 90/6 + 3 = 18 s at 6 deg/s and 2 deg/s2, so the pass takes 18 + 42 = 60 s.
    const pass: Step[] = [
      { kind: 'swing', to: 'clear' },
      { kind: 'dwell', for_s: 42 },
    ];
    expect(run({ steps: until('00:01', pass) }, { secondsPerStep: 60 })).toHaveLength(2);
    expect(run({ steps: until('00:01', [...pass, { kind: 'settle', for_s: 0.001 }]) })).toHaveLength(0);
  });
});

test('beyond 10,000 executed steps it refuses to go on', () => {
  expect(() => run({ steps: [{ kind: 'repeat', times: 10_001, steps: [mark('a')] }] })).toThrow('10000');
  expect(run({ steps: [{ kind: 'repeat', times: 10_000, steps: [mark('a')] }] })).toHaveLength(10_000);
});

test('repeats that hold nothing are passed over, and do not turn for ever', () => {
  const empty: Step = { kind: 'repeat', times: 5, steps: [] };
  expect(run({ steps: [empty, mark('a')] }).map(({ path }) => path)).toEqual(['2.mark']);
  expect(() => run({ steps: [{ kind: 'repeat', times: 1_000_000_000, steps: [empty] }] })).toThrow(RangeError);
});

describe('a run that is to be over by a time', () => {
  const pair: Step[] = [
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 600 },
    { kind: 'swing', to: 'far' },
    { kind: 'dwell', for_s: 600 },
  ];
  const isDwell = ({ step }: PlannedItem) => step.kind === 'dwell';

  /** What is executed when the end is asked for after so many steps. */
  function cutAfter(steps: Step[], count: number, finishByUtcMs = 0): PlannedItem[] {
    const items: PlannedItem[] = [];
    let cursor = beginCursor();
    for (;;) {
      const state: CursorState = items.length >= count ? { ...cursor, finishByUtcMs } : cursor;
      const next = advanceCursor(planOf({ steps }), state, { utcMs: items.filter(isDwell).length * 600_000, angleDeg: 0 });
      if (next.item === null) return items;
      items.push(next.item);
      cursor = next.cursor;
    }
  }

  test('makes whole pairs only, wherever it is asked, also where pairs are repeated in repeats', () => {
    const steps: Step[] = [
      { kind: 'home' },
      { kind: 'repeat', times: 2, steps: [{ kind: 'repeat', times: 3, steps: pair }, mark('six')] },
      mark('end'),
    ];
    for (let count = 0; count <= 1 + 2 * (3 * 4 + 1) + 1; count += 1) {
      const items = cutAfter(steps, count);
      const stations = items.flatMap(({ step }) => (step.kind === 'swing' ? [step.to] : []));
      expect(stations.join(' ')).toMatch(/^(near far ?)*$/);
      expect(items.filter(isDwell).length).toBe(stations.length);
      expect(items.at(-1)?.path).toBe('3.mark');
    }
  });

  test('a repeat that only stands still is a part of its pair and is never cut', () => {
    const twice: Step[] = pair.flatMap((step): Step[] => (step.kind === 'dwell' ? [{ kind: 'repeat', times: 2, steps: [step] }] : [step]));
    expect(cutAfter([{ kind: 'repeat', times: 5, steps: twice }], 2).filter(isDwell).length).toBe(4);
  });

  test('counts what comes after the pairs: a pass begins only if all of it still ends in time', () => {
    const steps: Step[] = [
      { kind: 'repeat', times: 50, steps: pair },
      { kind: 'settle', for_s: 3600 },
    ];
    // By the plan a move takes some seconds more; the moments above count dwells alone.
    const made = (byS: number) => cutAfter(steps, 0, 1000 * byS).filter(isDwell).length / 2;
    expect(made(3 * 1200 + 3600 + 120)).toBe(3);
    expect(made(3 * 1200 + 3600 - 120)).toBe(2);
    expect(made(1200)).toBe(0);
  });
});
