import type { SeededKinds } from '../seeded/try-seeds';
import { checks } from './checks';
import { runNight } from './night';
import { situations, type Situation } from './situations';

/** Runs one night and gives what is wrong with it, the name of the check before it; nothing when all holds. */
export async function tryNight(situation: Situation, seed: number): Promise<string[]> {
  const night = await runNight(situation, seed);
  return Object.entries(checks).flatMap(([name, check]) => {
    const wrong = check(night, situation);
    return wrong === null ? [] : [`${situation.name}, seed ${seed}, ${name}: ${wrong}`];
  });
}

export const linkKinds: SeededKinds = Object.fromEntries(
  situations.map((situation) => [situation.name, { attempt: (seed: number) => tryNight(situation, seed), first: 1_000, second: 50_000 }]),
);
