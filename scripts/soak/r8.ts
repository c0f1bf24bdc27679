import { phoneFaults } from './phone/faulty-network';
import { tryPhone } from './phone/try-phone';
import { soak } from './report';

/**
 * A phone on a bad network, eight ways, each from 25 seeds, or 500 as the second figure: a resume and a stop are tapped. `--fault NAME` and
 * `--seed N` try one of them again.
 */
const FIRST = 25;
const SECOND = 500;

soak('r8', async (args) => {
  const valueOf = (name: string) => (args.includes(name) ? args[args.indexOf(name) + 1] : undefined);
  const [only, seed] = [valueOf('--fault'), valueOf('--seed')];
  const seeds = args.includes('--second') ? SECOND : FIRST;
  const violations: string[] = [];
  const tried: Record<string, number> = {};
  for (const fault of phoneFaults.filter((name) => only === undefined || name === only)) {
    const chosen = seed === undefined ? Array.from({ length: seeds }, (_, index) => index + 1) : [Number(seed)];
    for (const number of chosen) violations.push(...(await tryPhone(fault, number)));
    tried[fault] = chosen.length;
  }
  return { ok: violations.length === 0, partial: only !== undefined || seed !== undefined, tried, violations };
});
