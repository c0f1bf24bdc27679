import { runClockNight, wrongWithClocks, type ClockNight } from '@/scripts/soak/clock/try-clocks';
import { tryFirst } from '@/scripts/soak/seeded/try-seeds';

/** Wall clocks that are set in a run: a slice of `npm run soak -- r9`. */

const RUNS = 16;

test('a run whose server’s clock is set by a second or an hour has the log that it would have had', async () => {
  expect(await tryFirst(RUNS, async (seed) => wrongWithClocks(await runClockNight(seed)))).toEqual([]);
});

describe('what would be wrong is seen', () => {
  const planted: Record<string, (night: ClockNight) => void> = {
    'the row 4 ends before it begins': ({ world }) => void Object.assign(world.store.rows.get(4) as object, { endUtcMs: 0 }),
    'the row 4 begins before the one before it ends': ({ world }) =>
      void Object.assign(world.store.rows.get(3) as object, { endUtcMs: 1e15 }),
    'the stamp of row 4 is off by': ({ world }) => {
      const row = world.store.rows.get(4);
      if (row !== undefined) row.startUtcMs += 6;
    },
    'is older than the one before it': ({ world }) =>
      void Object.assign(world.store.events[8] as object, { at: '2026-03-01T21:00:00.000Z' }),
    'the log does not say that the clock was set': ({ world }) => {
      for (const event of world.store.events) if (event.kind === 'clock-stepped') event.kind = 'changed';
    },
  };

  test.each(Object.keys(planted))('%s', async (what) => {
    const night = await runClockNight(1);
    planted[what]?.(night);
    expect(wrongWithClocks(night).join('\n')).toContain(what);
  });
});
