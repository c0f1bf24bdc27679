import { crashRounds } from '@/scripts/soak/run/crash-rounds';

/** A slice of `npm run soak -- r4`; more rounds by `EVENFALL_CRASH_ROUNDS`. */
jest.setTimeout(600_000);
const ROUNDS = Number(process.env['EVENFALL_CRASH_ROUNDS'] ?? 5);

test('PostgreSQL crashes in a run, again and again: hold and stop are answered, the run goes on after it, and nothing that was told is lost', async () => {
  const { violations, told, answeredMs } = await crashRounds('crash-test', ROUNDS);
  expect(violations).toEqual([]);
  expect(told.size).toBeGreaterThan(ROUNDS);
  expect(answeredMs).toHaveLength(Math.floor(ROUNDS / 3) + 1);
});
