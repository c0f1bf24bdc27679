import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { wrongWith } from './run/checks';
import { runNight } from './run/night';
import { soak } from './report';

/**
 * Nights of the production engine, link and codec with every fault of line, controller, process, database, clock and people mixed, from
 * seeds: 20,000, or 1,000,000 as the second figure. `--seed N` runs one again, `--from N` and `--seeds N` choose others. A seed that fails is
 * kept in `tests/fixtures/failing-seeds.json`, and played again with every run of the tests for ever.
 */
const FIRST = 20_000;
const SECOND = 1_000_000;
const REPLAYS = 1_000;
const KEPT_VIOLATIONS = 20;
const TOLD_EVERY = 1_000;
const keptFile = join(__dirname, '..', '..', 'tests', 'fixtures', 'failing-seeds.json');

function keep(seed: number): void {
  const kept = existsSync(keptFile) ? (JSON.parse(readFileSync(keptFile, 'utf8')) as { r1: number[] }) : { r1: [] };
  if (kept.r1.includes(seed)) return;
  mkdirSync(dirname(keptFile), { recursive: true });
  writeFileSync(keptFile, `${JSON.stringify({ ...kept, r1: [...kept.r1, seed].sort((a, b) => a - b) })}\n`);
}

soak('r1', async (args) => {
  const numberOf = (name: string) => (args.includes(name) ? Number(args[args.indexOf(name) + 1]) : null);
  const only = numberOf('--seed');
  const from = only ?? numberOf('--from') ?? 1;
  const count = only !== null ? 1 : (numberOf('--seeds') ?? (args.includes('--second') ? SECOND : FIRST));
  process.stderr.write(`seeds ${from} to ${from + count - 1}\n`);
  const violations: string[] = [];
  const hashes = new Map<number, string>();
  const ends: Record<string, number> = {};
  let failedNights = 0;
  for (let seed = from; seed < from + count; seed += 1) {
    const night = await runNight(seed);
    ends[night.healed] = (ends[night.healed] ?? 0) + 1;
    if (hashes.size < REPLAYS) hashes.set(seed, night.hash);
    const wrong = wrongWith(night);
    if (wrong.length > 0) {
      failedNights += 1;
      keep(seed);
    }
    if (violations.length < KEPT_VIOLATIONS) violations.push(...wrong);
    if ((seed - from + 1) % TOLD_EVERY === 0) process.stderr.write(`${seed - from + 1} nights, ${failedNights} with a violation\n`);
  }
  const replays = await replayed(hashes);
  const ok = failedNights === 0 && replays.identical === replays.of;
  return { ok, partial: only !== null, from, nights: count, ends, failedNights, replays, violations };
});

/** The same seed leaves the same log. */
async function replayed(hashes: ReadonlyMap<number, string>): Promise<{ of: number; identical: number }> {
  let identical = 0;
  for (const [seed, hash] of hashes) if ((await runNight(seed)).hash === hash) identical += 1;
  return { of: hashes.size, identical };
}
