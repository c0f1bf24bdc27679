import { inputWords } from '../evaluation/input-words';
import type { Finding } from '../protocol/finding';
import type { RigDocument } from '../rig/document';
import { excursionFindings, nearLimitAdvice } from './excursion';
import { togetherSource, type PredictedU } from './plan-uncertainty';

/** The noise counts as small beside the geometry below this share of it. */
const smallShare = 0.1;
/** Advice that needs the night worked out: where more dwells would not help, and where the pendulum would hit or leave something. */
export function adviseNight(rig: RigDocument, { predicted, peakRad }: { predicted: PredictedU | null; peakRad: number | null }): Finding[] {
  return [...geometryDecides(predicted), ...excursionFindings(rig, peakRad), ...nearLimitAdvice(rig, peakRad)];
}

const percent = (share: number) => `${(100 * share).toPrecision(2)} %`;

function geometryDecides(predicted: PredictedU | null): Finding[] {
  if (predicted === null) return [];
  const { bySource, statistics } = predicted;
  const [source, u] = Object.entries(bySource)
    .filter(([name]) => name !== 'reversal_rad' && name !== togetherSource)
    .reduce((a, b) => (b[1] > a[1] ? b : a), ['', 0]);
  if (!(statistics < smallShare * u)) return [];
  return [
    {
      code: 'geometry-decides',
      path: null,
      message: `The dwells leave ${percent(statistics)} of G open, one input alone ${percent(u)}: ${inputWords(source)} (${source}). More dwells do not help; measure it better.`,
    },
  ];
}
