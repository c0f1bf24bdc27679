import type { RunDriver } from '../../engine/run-driver';
import type { RunFacts } from '../../engine/run-facts';

/** A run most of whose dwells are not good: told from half time on, and ended on a whole pair unless the last ones show that what was wrong is over. */

/** With fewer dwells than these it is too early to say that few are good. */
const leastDwells = 4;

export interface DwellsSoFar {
  /** Those whose other one of the pair somebody skipped are not counted as done: nobody need be told of what was done on purpose. */
  done: number;
  good: number;
  planned: number;
  /** The last ones, four at most, are good; false as well where there are fewer. */
  lastAreGood: boolean;
  finishing: RunFacts['finishing'];
}

type DwellFacts = Pick<RunFacts, 'dwellsDone' | 'dwellsUnpaired' | 'dwellsGood' | 'dwellsPlanned' | 'lastDwellsAreGood' | 'finishing'>;

export const dwellsSoFar = (facts: DwellFacts): DwellsSoFar => ({
  done: facts.dwellsDone - facts.dwellsUnpaired,
  good: facts.dwellsGood,
  planned: facts.dwellsPlanned,
  lastAreGood: facts.lastDwellsAreGood,
  finishing: facts.finishing,
});

/** From half time on, fewer than half of the dwells are good (common practice, no source). */
const areFewGood = ({ done, good, planned }: DwellsSoFar): boolean => done >= leastDwells && 2 * done >= planned && 2 * good < done;

/** That few are good, and what comes of it: in words; null where they are not few. */
export function fewGoodWords(dwells: DwellsSoFar): string | null {
  if (!areFewGood(dwells)) return null;
  const { done, good, planned, lastAreGood, finishing } = dwells;
  const words = `${String(good)} of ${String(done)} dwells are good so far; ${String(planned)} are planned.`;
  if (finishing !== null && finishing.withdrawnBy === null) return `${words} The run ends on a whole pair.`;
  if (finishing !== null) return `${words} The run goes on, as ${String(finishing.withdrawnBy)} decided.`;
  return lastAreGood ? `${words} The last ones are good, so the run goes on.` : words;
}

/** Ends the run with the pair under way; not where the last dwells are good, nor where somebody has decided about its end, or it ends so already. */
export async function heedFewGood(driver: RunDriver): Promise<void> {
  const dwells = dwellsSoFar(driver.facts());
  const { finishing } = dwells;
  const mayAsk = finishing === null || (finishing.withdrawnBy === null && finishing.finishByUtcMs !== null);
  if (mayAsk && areFewGood(dwells) && !dwells.lastAreGood) await driver.requests.finishEarly('');
}
