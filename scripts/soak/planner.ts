import { throughTheChain } from './planner/chain-nights';
import { geometricMean, heldAgainstPlan } from './planner/dwell-nights';
import { soak } from './report';

/**
 * Whether nights scatter as the planner says: on three rigs with plain, shaped and awaited swings, each within 22 %, their geometric mean
 * within 7 %, near minus far and G, over 100 nights (1,000 as the second figure); and three nights of each from the plan through engine and archive to the
 * evaluation, whose errors are as great as planned altogether. `--nights N` looks at fewer of the first and keeps nothing.
 */
const FIRST = 100;
const SECOND = 1_000;
const GREATEST = { each: 0.22, mean: 0.07 };
/** 27 nights tell a scatter to 14 %: within two and a half standard deviations, and no night alone beyond five. */
const CHAIN = { scatter: 0.35, night: 5 };

soak('planner', async (args) => {
  const partial = args.includes('--nights');
  const nights = partial ? Number(args[args.indexOf('--nights') + 1]) : args.includes('--second') ? SECOND : FIRST;
  const planned = heldAgainstPlan(nights);
  const mean = geometricMean(planned.map(({ ratio }) => ratio));
  const meanOfG = geometricMean(planned.map(({ ratioOfG }) => ratioOfG));
  const chain = partial ? [] : await throughTheChain();
  const pulls = chain.flatMap((one) => one.pulls);
  const chainScatter = Math.sqrt(pulls.reduce((sum, pull) => sum + pull * pull, 0) / pulls.length);
  const ok =
    planned.every(({ ratio, ratioOfG }) => [ratio, ratioOfG].every((one) => Math.abs(one - 1) < GREATEST.each)) &&
    [mean, meanOfG].every((one) => Math.abs(one - 1) < GREATEST.mean) &&
    Math.abs(chainScatter - 1) < CHAIN.scatter &&
    pulls.every((pull) => Math.abs(pull) < CHAIN.night);
  return { ok: partial || ok, nights, geometricMean: mean, geometricMeanOfG: meanOfG, planned, chainScatter, chain };
});
