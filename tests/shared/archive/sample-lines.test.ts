import * as fc from 'fast-check';
import { readCsv } from '@/server/ingest/csv-read';
import { sniffCsv } from '@/server/ingest/csv-sniff';
import { readNdjson } from '@/server/ingest/read-ndjson';
import { csvHead, csvLines, ndjsonLines } from '@/shared/archive/sample-lines';

const nowUtcMs = Date.UTC(2031, 4, 6);

/** Every finite double, subnormal ones and both zeros included. */
const doubles = fc.array(fc.double({ noNaN: true, noDefaultInfinity: true }), { minLength: 1, maxLength: 40 });
/** Whole microseconds, growing. */
const instants = (count: number, stepUs: number) =>
  Float64Array.from({ length: count }, (_, k) => nowUtcMs - 3_600_000 + (k * stepUs) / 1000);
const bits = (values: Iterable<number>) => [...new BigUint64Array(Float64Array.from(values).buffer)];
const microseconds = (utcMs: Iterable<number>) => Array.from(utcMs, (ms) => Math.round(ms * 1000));

test('what is exported as CSV is imported to the same bits, by the mapping that the file itself suggests', async () => {
  await fc.assert(
    fc.asyncProperty(doubles, fc.integer({ min: 1, max: 2_000_001 }), async (values, stepUs) => {
      const samples = { utcMs: instants(values.length, stepUs), value: Float64Array.from(values) };
      const bytes = Buffer.from(csvHead('mrad') + csvLines(samples));
      const { mapping, ambiguous } = sniffCsv(bytes, true);
      expect({ mapping, ambiguous }).toMatchObject({ mapping: { unit: 'mrad', timeFormat: 'iso', headerRow: true }, ambiguous: [] });
      const read = { utcMs: [] as number[], value: [] as number[] };
      const reading = await readCsv(
        (async function* () {
          yield bytes;
        })(),
        {
          mapping,
          limits: { nowUtcMs },
          take: async (batch) => {
            read.utcMs.push(...batch.utcMs);
            read.value.push(...batch.value);
          },
        },
      );
      expect(reading.problems).toEqual([]);
      expect(bits(read.value)).toEqual(bits(values));
      expect(microseconds(read.utcMs)).toEqual(microseconds(samples.utcMs));
    }),
    { numRuns: 100 },
  );
});

test('what is exported as lines of JSON is taken in as a device would send it, to the same bits', () => {
  fc.assert(
    fc.property(doubles, fc.string({ minLength: 1, maxLength: 12 }), (values, name) => {
      const samples = { utcMs: instants(values.length, 1237), value: Float64Array.from(values) };
      const { batches, problems } = readNdjson(ndjsonLines(samples, name), { channels: [name], nowUtcMs });
      expect(problems).toEqual([]);
      const back = batches.get(name);
      expect(bits(back?.value ?? [])).toEqual(bits(values));
      expect(microseconds(back?.utcMs ?? [])).toEqual(microseconds(samples.utcMs));
    }),
    { numRuns: 100 },
  );
});

test('a unit that holds a comma or a quotation mark stays in its column', () => {
  expect(csvHead('urad')).toBe('time_utc,value (urad)\n');
  expect(csvHead('a,"b"')).toBe('time_utc,"value (a,""b"")"\n');
});
