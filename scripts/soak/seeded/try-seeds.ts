/** What is wrong with the case of a seed, in words that name the seed; nothing when all holds. */
export type Attempt = (seed: number) => readonly string[] | Promise<readonly string[]>;

/** Cases of one kind, and how many of them a soak tries. */
export interface SeededKind {
  attempt: Attempt;
  first: number;
  second: number;
}
export type SeededKinds = Readonly<Record<string, SeededKind>>;

/** Tries one seed. An attempt that breaks off is wrong, and its seed is told. */
export async function trySeed(attempt: Attempt, seed: number): Promise<readonly string[]> {
  try {
    return await attempt(seed);
  } catch (error) {
    return [`seed ${seed} broke off: ${error instanceof Error ? (error.stack ?? error.message) : String(error)}`];
  }
}

/** Tries the seeds from 1 on; what is wrong with them. */
export async function tryFirst(count: number, attempt: Attempt): Promise<string[]> {
  const wrong: string[] = [];
  for (let seed = 1; seed <= count; seed += 1) wrong.push(...(await trySeed(attempt, seed)));
  return wrong;
}
