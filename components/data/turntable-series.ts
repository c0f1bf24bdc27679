import type { StepRowView } from '@/shared/contracts/runs';
import type { PlottedSeries } from './plotted-channel';

/** The turntable's angle over a run, deg, straight from end to end of each step of its log; null where the log knows none. Pure. */
export function turntableSeries(rows: readonly StepRowView[]): PlottedSeries | null {
  const known = rows.flatMap((row) =>
    row.angleEndDeg === null || row.endUtcMs === null
      ? []
      : [
          { utcMs: row.startUtcMs, deg: row.angleStartDeg ?? row.angleEndDeg },
          { utcMs: row.endUtcMs, deg: row.angleEndDeg },
        ],
  );
  if (known.length === 0) return null;
  return {
    utcMs: known.map(({ utcMs }) => utcMs),
    value: known.map(({ deg }) => deg),
    unit: 'deg',
    thinned: false,
    gapMs: Infinity,
    uAt: (utcMs) => rows.findLast((row) => row.startUtcMs <= utcMs)?.uAngleDeg ?? null,
  };
}
