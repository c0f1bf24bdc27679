import { parseInstant } from '@/shared/archive/instants';
import type { SampleBatch } from '../interfaces/sample-store';

/** Samples as devices send them: one JSON object a line, `{"channel": "box temperature", "time_utc": "2031-02-14T20:00:00.1Z", "value": 21.3}`. */

export interface LineProblem {
  /** From 1, as an editor counts. */
  line: number;
  message: string;
}

export interface ReadSamples {
  /** By channel name, in the order of the lines. */
  batches: Map<string, SampleBatch & { lines: number[] }>;
  problems: LineProblem[];
}

export interface NdjsonRules {
  /** Channels that the device may fill; with a single one a line need not name it. */
  channels: readonly string[];
  nowUtcMs: number;
}

/** A clock that is ahead by more than this is wrong; how old a sample may be. */
const MOST_AHEAD_MS = 60_000;
const MOST_BEHIND_MS = 366 * 86_400_000;
/** More problems than this are not told apart. */
export const MOST_PROBLEMS = 20;

/** Reads every line; a line that cannot be used is named with what would be right. */
export function readNdjson(text: string, rules: NdjsonRules): ReadSamples {
  const found = new Map<string, { utcMs: number[]; value: number[]; lines: number[] }>();
  const problems: LineProblem[] = [];
  text.split('\n').forEach((line, index) => {
    if (line.trim() === '') return;
    const read = readLine(line, rules);
    if (typeof read === 'string') {
      problems.push({ line: index + 1, message: read });
      return;
    }
    const batch = found.get(read.channel) ?? { utcMs: [], value: [], lines: [] };
    found.set(read.channel, batch);
    batch.utcMs.push(read.utcMs);
    batch.value.push(read.value);
    batch.lines.push(index + 1);
  });
  const batches = [...found].map(
    ([channel, { utcMs, value, lines }]) => [channel, { utcMs: Float64Array.from(utcMs), value: Float64Array.from(value), lines }] as const,
  );
  return { batches: new Map(batches), problems };
}

interface Sample {
  channel: string;
  utcMs: number;
  value: number;
}

const fields = ['channel', 'time_utc', 'value'];

/** The sample, or what is wrong with the line. */
function readLine(line: string, { channels, nowUtcMs }: NdjsonRules): Sample | string {
  let record: unknown;
  try {
    record = JSON.parse(line);
  } catch {
    return 'is not JSON; write one object a line, such as {"time_utc": "2031-02-14T20:00:00.1Z", "value": 21.3}';
  }
  if (typeof record !== 'object' || record === null || Array.isArray(record)) return 'is no JSON object with channel, time_utc and value';
  const unknown = Object.keys(record).find((key) => !fields.includes(key));
  if (unknown !== undefined) return `has the unknown field "${unknown}"; known are ${fields.join(', ')}`;
  const { channel = channels.length === 1 ? channels[0] : undefined, time_utc: time, value } = record as Record<string, unknown>;
  if (channel === undefined) return `names no channel; this device fills ${listed(channels)}`;
  if (typeof channel !== 'string' || !channels.includes(channel))
    return `names the channel ${JSON.stringify(channel)}, which this token may not fill; it may fill ${listed(channels)}`;
  if (typeof value !== 'number' || !Number.isFinite(value))
    return `has the value ${JSON.stringify(value) ?? 'nothing'}; a finite number is needed`;
  const utcMs = typeof time === 'string' ? parseInstant(time) : Number.NaN;
  if (Number.isNaN(utcMs)) return `has the time ${JSON.stringify(time) ?? 'nothing'}; write UTC as 2031-02-14T20:00:00.125Z`;
  return untimely(utcMs, nowUtcMs) ?? { channel, utcMs, value };
}

/** What is wrong with the instant of a sample that has just come; null where nothing is. */
export function untimely(utcMs: number, nowUtcMs: number): string | null {
  const aheadMs = utcMs - nowUtcMs;
  if (aheadMs > MOST_AHEAD_MS)
    return `lies ${Math.round(aheadMs / 1000)} s in the future by the clock of the server; set the clock of the device (NTP)`;
  return -aheadMs > MOST_BEHIND_MS ? 'is older than a year; bring old data in as a file' : null;
}

const listed = (channels: readonly string[]) => channels.map((name) => JSON.stringify(name)).join(', ');
