import type { Finding } from '../protocol/finding';
import type { RigDocument } from '../rig/document';
import type { PredictedU } from './plan-uncertainty';

/** The noise counts as small beside the geometry below this share of it. */
const smallShare = 0.1;
/** Share of the free travel that a plan may use. */
const travelShare = 0.8;

/** Advice that needs the night worked out: where more dwells would not help, and where the pendulum would hit or leave something. */
export function adviseNight(rig: RigDocument, { predicted, peakRad }: { predicted: PredictedU | null; peakRad: number | null }): Finding[] {
  return [...geometryDecides(predicted), ...excursion(rig, peakRad)];
}

const percent = (share: number) => `${(100 * share).toPrecision(2)} %`;

function geometryDecides(predicted: PredictedU | null): Finding[] {
  if (predicted === null) return [];
  const { bySource, statistics } = predicted;
  const [source, u] = Object.entries(bySource)
    .filter(([name]) => name !== 'reversal_rad')
    .reduce((a, b) => (b[1] > a[1] ? b : a), ['', 0]);
  if (!(statistics < smallShare * u)) return [];
  return [
    {
      code: 'geometry-decides',
      path: null,
      message: `The dwells leave ${percent(statistics)} of G open, ${source} alone ${percent(u)}. More dwells do not help; measure ${source} better.`,
    },
  ];
}

function excursion(rig: RigDocument, peakRad: number | null): Finding[] {
  if (peakRad === null) return [];
  const limits: [string, number | undefined][] = [
    [`${travelShare} of pendulum.travel_rad`, rig.pendulum.travel_rad === undefined ? undefined : travelShare * rig.pendulum.travel_rad],
    ['readout.range_rad', rig.readout?.range_rad],
  ];
  return limits.flatMap(([name, limit]) =>
    limit === undefined || peakRad <= limit
      ? []
      : [
          {
            code: 'excursion',
            path: null,
            message: `The pendulum would swing out to ${(1000 * peakRad).toPrecision(3)} mrad, beyond ${name}, ${(1000 * limit).toPrecision(3)} mrad. Take a beat of whole periods, or smaller swings.`,
          },
        ],
  );
}
