import { geometricMean, heldAgainstPlan } from './planner/dwell-nights';
import { soak } from './report';

/**
 * Whether nights scatter as the planner says: on three rigs with plain, shaped and awaited swings, each within 22 %, their geometric mean
 * within 7 %, over 100 nights (1,000 as the second figure). `--nights N` looks at fewer and keeps nothing.
 */
const FIRST = 100;
const SECOND = 1_000;
const GREATEST = { each: 0.22, mean: 0.07 };

soak('planner', (args) => {
  const partial = args.includes('--nights');
  const nights = partial ? Number(args[args.indexOf('--nights') + 1]) : args.includes('--second') ? SECOND : FIRST;
  const planned = heldAgainstPlan(nights);
  const mean = geometricMean(planned);
  const ok = planned.every(({ ratio }) => Math.abs(ratio - 1) < GREATEST.each) && Math.abs(mean - 1) < GREATEST.mean;
  return { ok: partial || ok, partial, nights, geometricMean: mean, planned };
});
