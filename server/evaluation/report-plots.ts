import { residualAllan } from '@/shared/evaluation/residual-allan';
import { residualRms } from '@/shared/evaluation/residual-rms';
import type { EvaluationResult, FitCurve } from '@/shared/evaluation/result';
import { reversalPoints } from '@/shared/evaluation/reversal-points';
import { formatDeflectionUncertain } from '@/shared/lib/format-angle';
import type { ReportPage } from './report-page';
import { plotRoomPt } from './report-plot';

/** The plots of the report, each with the words that say what they show. */

const micro = 1e6;
const milli = 1e3;
const fitPt = { curve: 110, residuals: 55 };

/** Centres of the dwells that count, each less the mean of its station. */
export function plotCentres(page: ReportPage, { dwells }: Pick<EvaluationResult, 'dwells'>): void {
  const meanOf = (station: string) => {
    const own = dwells.flatMap((dwell) =>
      dwell.used && dwell.station === station && dwell.theta_rad !== null ? [dwell.theta_rad.value] : [],
    );
    return own.reduce((sum, value) => sum + value, 0) / Math.max(1, own.length);
  };
  const means = { near: meanOf('near'), far: meanOf('far') };
  page.plot({
    points: dwells.flatMap(({ seq, station, used, theta_rad: theta }) =>
      used && theta !== null && (station === 'near' || station === 'far')
        ? [
            {
              x: seq,
              y: (theta.value - means[station]) * micro,
              u: theta.u * micro,
              mark: station === 'far' ? ('ring' as const) : ('disc' as const),
            },
          ]
        : [],
    ),
    whole: true,
    yWords: 'Centre less the mean of its station, µrad, with ± u: near disc, far ring',
    xWords: 'row of the step log',
  });
}

/** Near minus far at each reversal with the result and its u as a band; without a band where u is not known. */
export function plotReversals(page: ReportPage, { dwells, reversal_rad: mean }: EvaluationResult): void {
  const points = reversalPoints(dwells);
  if (mean === null || points.length === 0) return;
  page.plot({
    points: points.map(({ index, rad }) => ({ x: index, y: rad * milli, mark: 'disc' })),
    ...(mean.u === null
      ? { lines: [{ points: [points[0]?.index ?? 1, points.length].map((x) => ({ x, y: mean.value * milli })) }] }
      : { band: { y: mean.value * milli, u: mean.u * milli } }),
    whole: true,
    yWords: `near − far at each reversal, mrad; ${mean.u === null ? 'line: the result, its u is not known' : 'line and band: the result ± u'}`,
    xWords: 'reversal',
  });
}

const rmsOf = (curve: FitCurve) => residualRms(curve).value;

/** The dwell of usual residuals and the one of the greatest, each with its fit and what the fit leaves. */
export function plotFits(page: ReportPage, curves: readonly FitCurve[]): void {
  const ranked = curves.filter(({ tS }) => tS.length > 1).sort((a, b) => rmsOf(a) - rmsOf(b));
  const [usual, worst] = [ranked[(ranked.length - 1) >> 1], ranked.at(-1)];
  if (usual === undefined || worst === undefined) return;
  page.heading('Fit and residuals', plotRoomPt(fitPt.curve) + plotRoomPt(fitPt.residuals) + 14);
  plotFit(page, usual, usual === worst ? 'the only one' : 'residuals as usual');
  if (usual !== worst) plotFit(page, worst, 'the greatest residuals');
}

function plotFit(page: ReportPage, curve: FitCurve, which: string): void {
  const at = (i: number, y: number) => ({ x: (curve.tS[i] as number) / 60, y });
  page.room(plotRoomPt(fitPt.curve) + plotRoomPt(fitPt.residuals) + 14);
  page.line(`Row ${curve.seq} at ${curve.station}, ${which}: rms ${formatDeflectionUncertain(residualRms(curve))}.`);
  page.plot(
    {
      points: curve.dataRad.map((y, i) => ({ ...at(i, y * milli), mark: 'dot' })),
      lines: [{ points: curve.modelRad.map((y, i) => at(i, y * milli)) }],
      yWords: 'deflection, mrad: data in bins and the fit',
      xWords: 'minutes',
    },
    fitPt.curve,
  );
  page.plot(
    {
      points: curve.dataRad.map((y, i) => ({ ...at(i, (y - (curve.modelRad[i] as number)) * micro), mark: 'dot' })),
      lines: [{ points: [at(0, 0), at(curve.tS.length - 1, 0)] }],
      yWords: 'data − fit, µrad',
      xWords: 'minutes',
    },
    fitPt.residuals,
  );
}

/** Allan deviation over averaging time with ± u, and what white noise would have. */
export function plotAllan(page: ReportPage, points: ReturnType<typeof residualAllan>): void {
  page.plot({
    points: points.map(({ tauS, deviationRad, u }) => ({ x: tauS, y: deviationRad * micro, u: u * micro, mark: 'disc' })),
    lines: [{ points: points.map(({ tauS, whiteRad }) => ({ x: tauS, y: whiteRad * micro })), dashed: true }],
    logarithmic: true,
    yWords: 'overlapping Allan deviation, µrad, with ± u; dashed: white noise',
    xWords: 'averaging time, s',
  });
}
