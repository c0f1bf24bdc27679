import { formatInstant } from './instants';

/** Samples as text that reads back to the same numbers, bit for bit. */

interface Samples {
  utcMs: Float64Array;
  value: Float64Array;
}

/** The shortest decimal that reads back to the same double, the sign of zero included. */
export const exactDecimal = (value: number): string => (Object.is(value, -0) ? '-0' : String(value));

/** The first line of a CSV; it says the unit. */
export const csvHead = (unit: string): string => `time_utc,${quoted(`value (${unit})`)}\n`;

const quoted = (text: string) => (/[",\r\n]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text);

export const csvLines = (samples: Samples): string => linesOf(samples, (time, value) => `${time},${value}\n`);

/** As devices send them, so that they can be sent again. */
export function ndjsonLines(samples: Samples, channel: string): string {
  const head = `{"channel":${JSON.stringify(channel)},"time_utc":"`;
  return linesOf(samples, (time, value) => `${head}${time}","value":${value}}\n`);
}

function linesOf({ utcMs, value }: Samples, line: (time: string, value: string) => string): string {
  let text = '';
  for (let index = 0; index < utcMs.length; index += 1)
    text += line(formatInstant(utcMs[index] as number), exactDecimal(value[index] as number));
  return text;
}

/** What the samples of 2 s come to; values in the channel's unit. */
export interface SampleSummary {
  fromUtcMs: number;
  count: number;
  mean: number;
  least: number;
  leastMs: number;
  greatest: number;
  greatestMs: number;
}

export const summariesHead = (unit: string): string =>
  `from_utc,count,${['mean', 'least'].map((name) => quoted(`${name} (${unit})`)).join(',')},least_utc,${quoted(`greatest (${unit})`)},greatest_utc\n`;

export const summaryLines = (summaries: readonly SampleSummary[]): string =>
  summaries
    .map(({ fromUtcMs, count, mean, least, leastMs, greatest, greatestMs }) =>
      [
        formatInstant(fromUtcMs),
        String(count),
        exactDecimal(mean),
        exactDecimal(least),
        formatInstant(leastMs),
        exactDecimal(greatest),
        formatInstant(greatestMs),
      ].join(','),
    )
    .map((line) => `${line}\n`)
    .join('');
