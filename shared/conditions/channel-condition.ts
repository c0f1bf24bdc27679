import { slopePerHour, type Reading, type Series } from './series';

/** What is asked of a channel over a stretch of time. */
export interface ChannelLimits {
  channel: string;
  below?: number | undefined;
  above?: number | undefined;
  slopeBelow_per_h?: number | undefined;
}

/** Each limit against the samples of the stretch: the greatest of them below, the least above, the slope to either side. */
export function channelReadings({ channel, below, above, slopeBelow_per_h }: ChannelLimits, series: Series): Reading[] {
  const { unit } = series;
  const readings: Reading[] = [];
  if (below !== undefined) {
    const value = extreme(series, Math.max);
    readings.push({ name: channel, value, limit: below, wanted: 'below', unit, met: value !== null && value < below });
  }
  if (above !== undefined) {
    const value = extreme(series, Math.min);
    readings.push({ name: channel, value, limit: above, wanted: 'above', unit, met: value !== null && value > above });
  }
  if (slopeBelow_per_h !== undefined) {
    const slope = slopePerHour(series);
    const value = slope === null ? null : Math.abs(slope);
    readings.push({
      ...{ name: `slope of ${channel}`, value, limit: slopeBelow_per_h, wanted: 'below', unit: `${unit}/h` },
      met: value !== null && value < slopeBelow_per_h,
    });
  }
  return readings;
}

function extreme({ value }: Series, pick: (a: number, b: number) => number): number | null {
  return value.length === 0 ? null : value.reduce((a, b) => pick(a, b));
}
