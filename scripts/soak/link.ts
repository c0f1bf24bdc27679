import { situations } from './link/situations';
import { tryNight } from './link/try-night';
import { soak } from './report';

/**
 * Nights with every kind of trouble on the line and at the machine, from seeds: 1,000 each, or 50,000 as the second figure. `--situation NAME`
 * and `--seed N` run one of them again.
 */
const FIRST = 1_000;
const SECOND = 50_000;
const KEPT_VIOLATIONS = 20;

soak('link', async (args) => {
  const valueOf = (name: string) => args[args.indexOf(name) + 1];
  const only = args.includes('--situation') ? valueOf('--situation') : null;
  const seed = args.includes('--seed') ? Number(valueOf('--seed')) : null;
  const seeds = args.includes('--second') ? SECOND : FIRST;
  const chosen = situations.filter(({ name }) => only === null || name === only);
  const violations: string[] = [];
  const nights: Record<string, number> = {};
  let failedNights = 0;
  for (const situation of chosen) {
    for (let turn = seed ?? 1; turn <= (seed ?? seeds); turn += 1) {
      const wrong = await tryNight(situation, turn);
      nights[situation.name] = (nights[situation.name] ?? 0) + 1;
      if (wrong.length > 0) failedNights += 1;
      if (violations.length < KEPT_VIOLATIONS) violations.push(...wrong);
    }
    process.stderr.write(`${situation.name}: ${nights[situation.name] ?? 0} nights, ${failedNights} with a violation so far\n`);
  }
  return { ok: failedNights === 0, partial: only !== null || seed !== null, nights, failedNights, violations };
});
