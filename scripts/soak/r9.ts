import { runClockNight, wrongWithClocks } from './clock/try-clocks';
import { tryRule } from './clock/try-rule';
import { soak } from './report';

/**
 * Time: 10,000 rules of schedules, each through a year in one of eight zones, or 1,000,000 as the second figure, beside an independent calendar; and 1,000 or 20,000
 * short runs while the wall clock of the server is set by 1 s or 1 h and gains or loses up to 200 ppm. `--seed N` tries one of each again.
 */
const FIRST = { rules: 10_000, runs: 1_000 };
const SECOND = { rules: 1_000_000, runs: 20_000 };

soak('r9', async (args) => {
  const only = args.includes('--seed') ? Number(args[args.indexOf('--seed') + 1]) : null;
  const count = only === null ? (args.includes('--second') ? SECOND : FIRST) : { rules: 1, runs: 1 };
  const seedsOf = (last: number) => Array.from({ length: last }, (_, index) => only ?? index + 1);
  const violations: string[] = [];
  for (const seed of seedsOf(count.rules)) violations.push(...tryRule(seed));
  for (const seed of seedsOf(count.runs)) violations.push(...wrongWithClocks(await runClockNight(seed)));
  return { ok: violations.length === 0, partial: only !== null, ...count, violations };
});
