import { allanDeviations } from '../statistics/allan';
import { abaDifference, type SidedValue } from '../statistics/drift';
import type { Analysis } from './analysis';
import type { PretendResult } from './result';
import { centreOf } from './ring-down-fit';

/** Dwells from which on a pretended difference means something. */
const fewestDwells = 3;

/**
 * The false near minus far of a still night: its dwells taken in turn as near and far, as the planned cadence would have had them.
 * Null with too few of them.
 */
export function pretendOf({ segments, found }: Analysis): PretendResult | null {
  if (found === null) return null;
  const series = segments
    .map((segment, i): SidedValue & { lengthS: number } => {
      const { startUtcMs, endUtcMs } = segment.window.row;
      const end = endUtcMs ?? startUtcMs;
      return { timeS: (startUtcMs + end) / 2000, side: 1, value: centreOf(found, i).value, lengthS: (end - startUtcMs) / 1000 };
    })
    .filter((_, i) => segments[i]?.window.row.kind === 'dwell')
    .sort((a, b) => a.timeS - b.timeS)
    .map((one, k) => ({ ...one, side: k % 2 === 0 ? (1 as const) : (-1 as const) }));
  const [first, last] = [series[0], series.at(-1)];
  if (first === undefined || last === undefined || series.length < fewestDwells) return null;
  const { value, u } = abaDifference(series);
  const tauS = (last.timeS - first.timeS) / (series.length - 1);
  const allan = allanDeviations(
    series.map((one) => one.value),
    tauS,
  );
  return {
    value,
    u,
    count: series.length - 1,
    allan: allan.map(({ tau_s, deviation, u: uOf }) => ({ tau_s, deviation_rad: deviation, u: uOf })),
  };
}
