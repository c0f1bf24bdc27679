import { execFileSync } from 'node:child_process';
import { join } from 'node:path';

/**
 * Of nights whose geometry, drift, gaps, outliers and clock nobody knows, the true G lies in the 95 % interval as often as it says.
 * 200 of them are for the soak `honesty`; of 30 at least 25 (the chance of fewer is 1 in 300). In a process of its own, where it is faster.
 */
test('of 30 nights at least 25 hold the true G in their interval, without a bias', () => {
  const root = join(__dirname, '../../..');
  const said = execFileSync(process.execPath, ['--import', 'tsx', 'scripts/soak/honesty.ts', '--nights', '30'], {
    cwd: root,
    encoding: 'utf8',
  });
  const { inside, meanPull, offsets } = JSON.parse(said) as { inside: number; meanPull: number; offsets: number };
  expect(inside).toBeGreaterThanOrEqual(25);
  // Three standard deviations of the mean of 30.
  expect(Math.abs(meanPull)).toBeLessThan(3 / Math.sqrt(30));
  expect(offsets).toBe(30);
}, 240_000);
