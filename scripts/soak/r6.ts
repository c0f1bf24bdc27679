import { losses, tryBusy, tryLoss } from './heartbeat/try-loss';
import { soak } from './report';

/**
 * The sign of life of a server ends in a swing, in four ways, at instants from seeds: 1,000 losses, or 20,000 as the second figure; and more than 24 h of
 * swings under a server that is late with everything, where nothing may trip. `--seed N` tries one of them again.
 */
const FIRST = 1_000;
const SECOND = 20_000;
/** Of 23 s each. */
const BUSY_SWINGS = 3_800;

soak('r6', async (args) => {
  const only = args.includes('--seed') ? Number(args[args.indexOf('--seed') + 1]) : null;
  const count = args.includes('--second') ? SECOND : FIRST;
  const upTo = (last: number) => (only === null ? Array.from({ length: last }, (_, index) => index + 1) : [only]);
  const [missed, falseTrips]: [string[], string[]] = [[], []];
  for (const seed of upTo(count)) {
    for (const [index, loss] of losses.entries())
      if (only !== null || seed % losses.length === index) missed.push(...(await tryLoss(loss, seed)));
  }
  const busy = Math.max(count, BUSY_SWINGS);
  for (const seed of upTo(busy)) falseTrips.push(...(await tryBusy(seed)));
  const violations = [...missed, ...falseTrips];
  return {
    ok: violations.length === 0,
    partial: only !== null,
    lost: count,
    busy,
    missed: missed.length,
    falseTrips: falseTrips.length,
    violations,
  };
});
