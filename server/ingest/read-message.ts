import { parseInstant } from '@/shared/archive/instants';
import type { BrokerTopic } from '@/shared/contracts/brokers';
import { untimely } from './read-ndjson';

const MOST_BYTES = 65_536;
const decimal = /^[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$/;

type Mapping = Pick<BrokerTopic, 'valuePath' | 'time'>;

/** The sample that a message holds, or why it holds none. `arrived`: when it came, UTC ms. */
export function readMessage(
  { payload, retained }: { payload: Uint8Array; retained: boolean },
  { valuePath, time }: Mapping,
  arrived: number,
): { utcMs: number; value: number } | string {
  if (payload.byteLength > MOST_BYTES) return `is longer than ${String(MOST_BYTES / 1024)} KiB`;
  if (retained && time === null)
    return 'was kept by the broker from before: it holds no time, and when it came says nothing of when it was measured';
  const text = Buffer.from(payload).toString('utf8').trim();
  const needsJson = valuePath !== null || time !== null;
  let whole: unknown = null;
  try {
    if (needsJson) whole = JSON.parse(text);
  } catch {
    return 'is not JSON';
  }
  const value = valuePath === null ? (needsJson ? whole : text) : at(whole, valuePath);
  const number = typeof value === 'string' ? (decimal.test(value.trim()) ? Number(value) : Number.NaN) : value;
  if (typeof number !== 'number' || !Number.isFinite(number))
    return `has ${valuePath === null ? '' : `at ${valuePath} `}${shown(value)}; a finite number with a decimal point is needed`;
  if (time === null) return { utcMs: arrived, value: number };
  const stamp = at(whole, time.path);
  const utcMs = instantOf(stamp, time.form);
  if (Number.isNaN(utcMs)) return `has at ${time.path} ${shown(stamp)}; ${rightForm[time.form]} is needed`;
  return untimely(utcMs, arrived) ?? { utcMs, value: number };
}

const rightForm = {
  iso: 'UTC as 2031-02-14T20:00:00.125Z',
  s: 'a number of seconds since 1970',
  ms: 'a number of milliseconds since 1970',
  us: 'a number of microseconds since 1970',
};

function instantOf(stamp: unknown, form: NonNullable<BrokerTopic['time']>['form']): number {
  if (form === 'iso') return typeof stamp === 'string' ? parseInstant(stamp) : Number.NaN;
  if (typeof stamp !== 'number' || !Number.isFinite(stamp)) return Number.NaN;
  // 1.8e15 µs is below 2⁵³: no microsecond is lost on the way.
  return form === 's' ? stamp * 1000 : form === 'us' ? stamp / 1000 : stamp;
}

/** `sensor.values[0].v` of a JSON value; undefined where there is nothing. */
function at(whole: unknown, path: string): unknown {
  return path
    .split(/\.|\[|\]\.?/)
    .filter((name) => name !== '')
    .reduce<unknown>((value, name) => {
      if (typeof value !== 'object' || value === null || !Object.hasOwn(value, name)) return undefined;
      return (value as Record<string, unknown>)[name];
    }, whole);
}

const shown = (value: unknown) => (value === undefined ? 'nothing' : (JSON.stringify(value) ?? 'nothing').slice(0, 60));
