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
}

export const dwellsSoFar = ({
  dwellsDone,
  dwellsUnpaired,
  dwellsGood,
  dwellsPlanned,
}: Pick<RunFacts, 'dwellsDone' | 'dwellsUnpaired' | 'dwellsGood' | 'dwellsPlanned'>): DwellsSoFar => ({
  done: dwellsDone - dwellsUnpaired,
  good: dwellsGood,
  planned: dwellsPlanned,
});

/** From half time on, fewer than half of the dwells are good (common practice, no source). */
const areFewGood = ({ done, good, planned }: DwellsSoFar): boolean => done >= leastDwells && 2 * done >= planned && 2 * good < done;

/** That few are good: in words; null where they are not few. */
export function fewGoodWords(dwells: DwellsSoFar): string | null {
  const { done, good, planned } = dwells;
  return areFewGood(dwells) ? `${String(good)} of ${String(done)} dwells are good so far; ${String(planned)} are planned.` : null;
}

/** Ends the run with the pair under way; not where the last dwells are good, nor where somebody has decided about its end, or it ends so already. */
export async function heedFewGood(driver: RunDriver): Promise<void> {
  const facts = driver.facts();
  const { finishing, lastDwellsAreGood } = facts;
  const mayAsk = finishing === null || (finishing.withdrawnBy === null && finishing.finishByUtcMs !== null);
  if (mayAsk && areFewGood(dwellsSoFar(facts)) && !lastDwellsAreGood) await driver.requests.finishEarly('');
}
