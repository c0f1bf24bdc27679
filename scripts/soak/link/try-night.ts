import type { SeededKinds } from '../seeded/try-seeds';
import { checks } from './checks';
import { runNight } from './night';
import { serialFaults, situations, type Situation } from './situations';

/** Runs one night and gives what is wrong with it, the name of the check before it; nothing when all holds. */
export async function tryNight(situation: Situation, seed: number): Promise<string[]> {
  const night = await runNight(situation, seed);
  return Object.entries(checks).flatMap(([name, check]) => {
    const wrong = check(night, situation);
    return wrong === null ? [] : [`${situation.name}, seed ${seed}, ${name}: ${wrong}`];
  });
}

const kindsOf = (chosen: readonly Situation[]): SeededKinds =>
  Object.fromEntries(
    chosen.map((situation) => [situation.name, { attempt: (seed: number) => tryNight(situation, seed), first: 1_000, second: 50_000 }]),
  );
const isSerialFault = ({ name }: Situation) => (serialFaults as readonly string[]).includes(name);

export const serialKinds = kindsOf(situations.filter(isSerialFault));
export const linkKinds = kindsOf(situations.filter((situation) => !isSerialFault(situation)));
