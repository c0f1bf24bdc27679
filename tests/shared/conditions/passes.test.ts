import * as fc from 'fast-check';
import { advanceCursor, beginCursor } from '@/shared/protocol/cursor';
import type { RepeatStep, Step } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';

/** A repeat that ends by what came of its passes, against a few lines of arithmetic. */

const dwells: Step[] = [
  { kind: 'dwell', for_s: 60 },
  { kind: 'dwell', for_s: 60 },
];

/** Passes made when the dwells come out as told and u falls as told. */
function passesOf(
  repeat: Omit<RepeatStep, 'kind' | 'steps'>,
  told: { good: (index: number) => boolean; u: (dwellsDone: number) => number | null },
): number {
  const plan = { protocol: { steps: [{ kind: 'repeat' as const, steps: dwells, ...repeat }] }, rig: demoRigWide, timeZone: 'UTC' };
  let cursor = beginCursor();
  let done = 0;
  for (;;) {
    const notGood = done > 0 && !told.good(done - 1);
    const next = advanceCursor(plan, cursor, { utcMs: 0, angleDeg: 0, notGood, relativeU: told.u(done) });
    if (next.item === null) return done / 2;
    // As a snapshot keeps it.
    cursor = JSON.parse(JSON.stringify(next.cursor)) as typeof cursor;
    done += 1;
  }
}

test('counting good: as many passes as it takes for so many whole ones, and never more than allowed', () => {
  fc.assert(
    fc.property(
      fc.integer({ min: 1, max: 5 }),
      fc.integer({ min: 0, max: 5 }),
      fc.array(fc.boolean(), { minLength: 24, maxLength: 24 }),
      (times, spare, good) => {
        const atMost = times + spare;
        let [passes, whole] = [0, 0];
        while (passes < atMost && whole < times) {
          if (good[2 * passes] === true && good[2 * passes + 1] === true) whole += 1;
          passes += 1;
        }
        expect(passesOf({ times, counting: 'good', atMost }, { good: (index) => good[index] !== false, u: () => null })).toBe(passes);
      },
    ),
    { numRuns: 50 },
  );
});

test('until u: at least and at most hold, and the first pass after which u is reached is the last', () => {
  fc.assert(
    fc.property(
      fc.integer({ min: 1, max: 6 }),
      fc.integer({ min: 0, max: 8 }),
      fc.integer({ min: 1, max: 20 }),
      (atLeast, spare, reachedAfter) => {
        const atMost = atLeast + spare;
        const u = (done: number) => (done / 2 >= reachedAfter ? 0.0009 : done < 4 ? null : 0.002);
        const passes = passesOf({ until: { relativeStatisticalU: 0.001 }, atLeast, atMost }, { good: () => true, u });
        expect(passes).toBe(Math.min(atMost, Math.max(atLeast, reachedAfter)));
      },
    ),
    { numRuns: 50 },
  );
});
