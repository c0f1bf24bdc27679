import { nightKinds, wrongWith } from './run/checks';
import { runNight } from './run/night';
import { soakSeeds } from './seeded/soak-seeds';

/**
 * Nights of the production engine, link and codec with every fault of line, controller, process, database, sensor, clock and people mixed, from
 * seeds. A thousand of them are played twice: the same seed leaves the same log.
 */
const REPLAYS = 1_000;
const hashes = new Map<number, string>();
const ends: Record<string, number> = {};

async function attempt(seed: number): Promise<string[]> {
  const night = await runNight(seed);
  ends[night.healed] = (ends[night.healed] ?? 0) + 1;
  if (hashes.size < REPLAYS) hashes.set(seed, night.hash);
  return wrongWith(night);
}

soakSeeds('r1', { ...nightKinds, night: { ...nightKinds.night, attempt } }, async () => {
  const violations: string[] = [];
  for (const [seed, hash] of hashes) if ((await runNight(seed)).hash !== hash) violations.push(`seed ${seed} leaves another log`);
  return { ends, replays: { of: hashes.size, identical: hashes.size - violations.length }, violations };
});
