import * as fc from 'fast-check';
import { readCsv, type CsvReading } from '@/server/ingest/csv-read';
import { sniffCsv } from '@/server/ingest/csv-sniff';
import { UnreadableFile } from '@/server/ingest/csv-text';
import { importMappingSchema, type ImportMapping } from '@/shared/contracts/data';
import { csvHead, csvLines } from '@/shared/archive/sample-lines';
import type { SeededKinds } from '../seeded/try-seeds';
import { bytes, mappings } from './odd-files';

const nowUtcMs = Date.UTC(2031, 3, 1);

interface Taken {
  reading: CsvReading;
  utcMs: number[];
  value: number[];
}

async function* pieces(file: Buffer, size: number): AsyncGenerator<Uint8Array> {
  for (let from = 0; from < file.length; from += size) yield file.subarray(from, from + size);
}

async function taken(file: Buffer, { size, mapping }: { size: number; mapping: ImportMapping }): Promise<Taken> {
  const [utcMs, value]: [number[], number[]] = [[], []];
  const reading = await readCsv(pieces(file, size), {
    mapping,
    limits: { nowUtcMs },
    take: async (batch) => {
      utcMs.push(...batch.utcMs);
      value.push(...batch.value);
    },
  });
  return { reading, utcMs, value };
}

/** What a file suggests, or null where it is said to be none. */
function suggested(file: Buffer): ImportMapping | null {
  try {
    return sniffCsv(file, true).mapping;
  } catch (error) {
    if (error instanceof UnreadableFile) return null;
    throw error;
  }
}

function unsound({ reading, utcMs, value }: Taken): string | null {
  if (utcMs.length !== value.length) return `${utcMs.length} instants and ${value.length} values were taken`;
  if (utcMs.length > reading.rows) return `${utcMs.length} samples were taken from ${reading.rows} rows`;
  if (reading.problemCount === 0 && (reading.rows === 0 || reading.rows > utcMs.length)) return 'rows were left out without a word';
  if (![...utcMs, ...value].every(Number.isFinite)) return 'a sample is no finite number';
  const back = utcMs.findIndex((at, index) => index > 0 && at <= (utcMs[index - 1] as number));
  return back < 0 ? null : `instant ${back + 1} does not lie after the one before`;
}

const files = fc.tuple(bytes, mappings, fc.integer({ min: 1, max: 40 }));

/** A file of any kind, with the mapping that it suggests or another: it is read or refused, and no sample that is taken is unsound. */
export async function tryFile(seed: number): Promise<string[]> {
  const [[file, mapping, size]] = fc.sample(files, { seed, numRuns: 1 }) as [[Buffer, ImportMapping, number]];
  const own = size % 2 === 0 ? suggested(file) : null;
  const wrong =
    own !== null && !importMappingSchema.safeParse(own).success
      ? `the suggested mapping ${JSON.stringify(own)} is none`
      : unsound(await taken(file, { size, mapping: own !== null && own.timeFormat !== 'elapsed-s' ? own : mapping }));
  return wrong === null ? [] : [`file ${seed}: ${wrong}: ${JSON.stringify(file.toString('latin1'))}`];
}

/** Every finite double, subnormal ones and both zeros included. */
const series = fc.tuple(
  fc.array(fc.double({ noNaN: true, noDefaultInfinity: true }), { minLength: 1, maxLength: 40 }),
  fc.integer({ min: 1, max: 2_000_001 }),
);
const bits = (values: Iterable<number>) => new BigUint64Array(Float64Array.from(values).buffer).join();
const microseconds = (utcMs: Iterable<number>) => Array.from(utcMs, (ms) => Math.round(ms * 1000)).join();

/** What is exported is taken in again by the mapping that the file suggests: the same bits, and the same microseconds. */
export async function tryRoundTrip(seed: number): Promise<string[]> {
  const [[values, stepUs]] = fc.sample(series, { seed, numRuns: 1 }) as [[number[], number]];
  const utcMs = Float64Array.from(values, (_, k) => nowUtcMs - 3_600_000 + (k * stepUs) / 1000);
  const file = Buffer.from(csvHead('mrad') + csvLines({ utcMs, value: Float64Array.from(values) }));
  const back = await taken(file, { size: 64, mapping: sniffCsv(file, true).mapping });
  const same = bits(back.value) === bits(values) && microseconds(back.utcMs) === microseconds(utcMs) && back.reading.problemCount === 0;
  return same ? [] : [`round trip ${seed}: ${JSON.stringify(values)} came back as ${JSON.stringify(back.value)}`];
}

export const fileKinds: SeededKinds = {
  file: { attempt: tryFile, first: 20_000, second: 1_000_000 },
  'round trip': { attempt: tryRoundTrip, first: 20_000, second: 1_000_000 },
};
