import { exclusionTest, type Exclusion } from '../archive/exclusions';
import type { SampleColumns } from '../archive/channel-csv';
import { boxAverage, medianInterval, type BoxAverages } from '../statistics/box-average';
import { toRad, type ChannelScale } from './channel-scale';
import type { DwellWindow } from './dwell-windows';

/** Samples of one window: seconds after its start, and readings in the channel's unit. */
export interface DwellSamples {
  window: DwellWindow;
  tS: Float64Array;
  reading: Float64Array;
  /** Middle of the dwell, s after the window's start: the instant whose centre is reported. */
  centreS: number;
}

/** The samples inside a window that no exclusion covers. */
export function samplesIn(window: DwellWindow, series: SampleColumns, exclusions: readonly Exclusion[]): DwellSamples {
  const from = firstAtOrAfter(series.utcMs, window.fromUtcMs);
  const to = firstAtOrAfter(series.utcMs, window.toUtcMs);
  const touching = exclusions.filter((one) => one.endUtcMs >= window.fromUtcMs && one.startUtcMs <= window.toUtcMs);
  const excluded = exclusionTest(touching);
  const kept: number[] | null = touching.length === 0 ? null : [];
  if (kept !== null) for (let k = from; k < to; k += 1) if (!excluded(series.utcMs[k] as number)) kept.push(k);
  const count = kept === null ? Math.max(0, to - from) : kept.length;
  const tS = new Float64Array(count);
  const reading = new Float64Array(count);
  for (let i = 0; i < count; i += 1) {
    const k = kept === null ? from + i : (kept[i] as number);
    tS[i] = ((series.utcMs[k] as number) - window.fromUtcMs) / 1000;
    reading[i] = series.value[k] as number;
  }
  const middleUtcMs = (window.row.startUtcMs + (window.row.endUtcMs ?? window.row.startUtcMs)) / 2;
  return { window, tS, reading, centreS: (middleUtcMs - window.fromUtcMs) / 1000 };
}

/** The same window as far as its first `lengthS` seconds, the centre reported in their middle. */
export function beginningOf({ window, tS, reading }: DwellSamples, lengthS: number): DwellSamples {
  const end = tS.findIndex((t) => t > lengthS);
  const count = end < 0 ? tS.length : end;
  return { window, tS: tS.slice(0, count), reading: reading.slice(0, count), centreS: lengthS / 2 };
}

function firstAtOrAfter(utcMs: Float64Array, at: number): number {
  let low = 0;
  let high = utcMs.length;
  while (low < high) {
    const middle = (low + high) >> 1;
    if ((utcMs[middle] as number) < at) low = middle + 1;
    else high = middle;
  }
  return low;
}

/** Pendulum angles of a window, averaged over boxes of about `widthS`. */
export function averagedAngles(samples: DwellSamples, scale: ChannelScale, widthS: number): BoxAverages {
  return boxAverage(
    samples.tS,
    samples.reading.map((reading) => toRad(scale, reading)),
    widthS,
  );
}

/** Why a window cannot be fitted from what its samples cover; null when it can. */
export function reasonAgainstSamples(samples: DwellSamples, averages: BoxAverages): string | null {
  if (samples.tS.length === 0) return 'no samples';
  if (averages.t.length < 8) return 'too few samples';
  const windowS = (samples.window.toUtcMs - samples.window.fromUtcMs) / 1000;
  const coveredS = medianInterval(samples.tS) * averages.samples;
  return coveredS < windowS / 2 ? 'samples cover less than half of it' : null;
}
