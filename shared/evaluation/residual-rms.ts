import type { FitCurve } from './result';

/** Offset, slope and the two amplitudes that every dwell has for itself. */
const ownParameters = 4;

/** Root mean square of data minus fit with its standard uncertainty, that of white noise (rad); u null where the dwell has no more bins than parameters of its own. */
export function residualRms({ dataRad, modelRad }: Pick<FitCurve, 'dataRad' | 'modelRad'>): { value: number; u: number | null } {
  const squares = dataRad.reduce((sum, y, i) => sum + (y - (modelRad[i] as number)) ** 2, 0);
  const value = Math.sqrt(squares / Math.max(1, dataRad.length));
  const freedom = dataRad.length - ownParameters;
  return { value, u: freedom > 0 ? value / Math.sqrt(2 * freedom) : null };
}
