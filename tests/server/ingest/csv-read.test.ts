import * as fc from 'fast-check';
import { readCsv, type CsvLimits } from '@/server/ingest/csv-read';
import type { SampleBatch } from '@/server/interfaces/sample-store';
import type { ImportMapping } from '@/shared/contracts/data';

const mapping: ImportMapping = {
  delimiter: ',',
  decimal: '.',
  headerRow: true,
  timeColumn: 0,
  timeFormat: 'iso',
  valueColumn: 1,
  unit: 'urad',
};
const limits: CsvLimits = { nowUtcMs: Date.UTC(2031, 3, 1) };

async function* pieces(text: string, size = 7): AsyncGenerator<Uint8Array> {
  const bytes = Buffer.from(text);
  for (let from = 0; from < bytes.length; from += size) yield bytes.subarray(from, from + size);
}

async function read(text: string, change: Partial<ImportMapping> = {}, more: Partial<CsvLimits> = {}) {
  const batches: SampleBatch[] = [];
  const reading = await readCsv(pieces(text), {
    mapping: { ...mapping, ...change },
    limits: { ...limits, ...more },
    take: async (batch) => void batches.push(batch),
  });
  return { ...reading, utcMs: batches.flatMap((batch) => [...batch.utcMs]), value: batches.flatMap((batch) => [...batch.value]) };
}

const row = (second: number, value: string) => `2031-03-14T22:00:${String(second).padStart(2, '0')}Z,${value}\n`;
const header = 'time_utc,deflection_urad\n';

describe('reading a deflection CSV', () => {
  it('gives every row its instant and its value', async () => {
    const reading = await read(`${header}2031-03-14T22:00:00.123456Z,1.5\n2031-03-14T23:00:01.5+01:00,-2e-1\n`);
    expect(reading).toMatchObject({ rows: 2, problemCount: 0, value: [1.5, -0.2], medianIntervalS: expect.closeTo(1.376544, 6) });
    expect(reading.utcMs).toEqual([Date.UTC(2031, 2, 14, 22) + 123.456, Date.UTC(2031, 2, 14, 22, 0, 1, 500)]);
  });

  it.each<[string, string, Partial<ImportMapping>, { row: number | null; column: string | null; message: string }]>([
    ['a value missing', `${header}${row(0, '')}`, {}, { row: 2, column: 'deflection_urad', message: 'the value is empty' }],
    ['NaN', `${header}${row(0, '1')}${row(1, 'NaN')}`, {}, { row: 3, column: 'deflection_urad', message: 'the value is NaN' }],
    ['a word', `${header}${row(0, 'high')}`, {}, { row: 2, column: 'deflection_urad', message: '"high" is no number: write it like 12.5' }],
    [
      'the other decimal sign',
      `${header}2031-03-14T22:00:00Z,"1,5"\n`,
      {},
      { row: 2, column: 'deflection_urad', message: 'it has the decimal sign ","' },
    ],
    [
      'a thousands separator',
      `${header}2031-03-14T22:00:00Z,"1,234.5"\n`,
      {},
      { row: 2, column: 'deflection_urad', message: 'without thousands separators' },
    ],
    [
      'too few columns',
      `${header}2031-03-14T22:00:00Z\n`,
      {},
      { row: 2, column: null, message: 'the row has 1 columns, the mapping needs 2' },
    ],
    [
      'a column the file does not have',
      header + row(0, '1'),
      { valueColumn: 5 },
      { row: 1, column: null, message: 'the mapping names column 6, but the file has 2 columns: time_utc, deflection_urad' },
    ],
    ['an instant twice', `${header}${row(1, '1')}${row(1, '2')}`, {}, { row: 3, column: 'time_utc', message: 'comes twice' }],
    [
      'time going back',
      `${header}${row(5, '1')}${row(4, '2')}`,
      {},
      { row: 3, column: 'time_utc', message: 'the time goes back from 2031-03-14T22:00:05.000Z to 2031-03-14T22:00:04.000Z' },
    ],
    ['no zone', `${header}2031-03-14T22:00:00,1\n`, {}, { row: 2, column: 'time_utc', message: 'names no zone' }],
    [
      'two ways of writing time',
      `${header}${row(0, '1')}1931724001,2\n`,
      {},
      { row: 3, column: 'time_utc', message: 'is not ISO 8601: the mapping says ISO 8601, and all rows must be written in one way' },
    ],
    [
      'a date among numbers',
      `${header}1931724000,1\n${row(1, '1')}`,
      { timeFormat: 'epoch-s' },
      { row: 3, column: 'time_utc', message: 'is written as a date, but the mapping says seconds since 1970' },
    ],
    [
      'a local date',
      `${header}03/04/2031 22:00,1\n`,
      {},
      { row: 2, column: 'time_utc', message: 'reads differently in different countries' },
    ],
    [
      'a day that does not exist',
      `${header}2031-02-30T22:00:00Z,1\n`,
      {},
      { row: 2, column: 'time_utc', message: 'does not exist in the calendar' },
    ],
    [
      'milliseconds read as seconds',
      `${header}1931724000000,1\n`,
      { timeFormat: 'epoch-s' },
      { row: 2, column: 'time_utc', message: 'is the time format of the mapping right?' },
    ],
    ['the future', `${header}2031-05-14T22:00:00Z,1\n`, {}, { row: 2, column: 'time_utc', message: 'lies in the future' }],
    [
      'an open quotation',
      `${header}${row(0, '1')}"2031-03-14T22:00:01Z,2\n${row(2, '3')}`,
      {},
      { row: 4, column: null, message: 'a quotation mark is opened and never closed' },
    ],
    ['nothing at all', header, {}, { row: null, column: null, message: 'there is no row of data' }],
  ])('says where %s is', async (...[, text, change, problem]) => {
    const { problems } = await read(text, change);
    expect(problems[0]).toEqual({ ...problem, message: expect.stringContaining(problem.message) });
  });

  it('takes two instants that are kept as one for the same', async () => {
    const { problems } = await read('t,v\n1931724000.0000001,1\n1931724000.0000003,2\n', { timeFormat: 'epoch-s' });
    expect(problems).toMatchObject([{ row: 3, message: expect.stringContaining('comes twice') }]);
  });

  it('counts every problem and keeps the first hundred', async () => {
    const text =
      header +
      Array.from(
        { length: 150 },
        (_, index) => `2031-03-14T22:${String(Math.floor(index / 60)).padStart(2, '0')}:${String(index % 60).padStart(2, '0')}Z,x\n`,
      ).join('');
    const reading = await read(text);
    expect(reading.problems).toHaveLength(100);
    expect(reading.problemCount).toBe(150);
    expect(reading.rows).toBe(150);
  });

  it('counts elapsed time from the stated instant, with the decimal comma where stated', async () => {
    const reading = await read('t;v\n0,5;1,25\n1,5;-3\n', {
      delimiter: ';',
      decimal: ',',
      timeFormat: 'elapsed-s',
      elapsedFrom: '2031-03-14T22:00:00Z',
    });
    expect(reading).toMatchObject({
      problemCount: 0,
      value: [1.25, -3],
      utcMs: [Date.UTC(2031, 2, 14, 22) + 500, Date.UTC(2031, 2, 14, 22) + 1500],
    });
  });

  it('has a problem with elapsed time that leads out of the calendar, and with one that leads before any such measurement', async () => {
    const mapping = { timeFormat: 'elapsed-s', elapsedFrom: '2031-03-14T22:00:00Z' } as const;
    const reading = await read(`${header}0,1\n1.4949230677924e122,2\n-9e9,3\n`, mapping);
    expect(reading.problems.map(({ row, message }) => [row, message])).toEqual([
      [3, 'the time "1.4949230677924e122" would be far outside the calendar: is the time format of the mapping right?'],
      [4, 'the time "-9e9" would be the year 1746: is the time format of the mapping right?'],
    ]);
    expect(reading.value).toEqual([1]);
  });

  describe('local times of a zone', () => {
    const zone = { timeZone: 'Europe/Zurich' };
    const local = (times: string[]) => read(`${header}${times.map((time, index) => `${time},${String(index)}\n`).join('')}`, zone);

    it('are read by its clocks, in winter and in summer, to the microsecond; an offset in the row counts for more', async () => {
      const reading = await local(['2031-01-14T22:00:00.123456', '2031-02-14 22:00:00', '2031-02-14T22:00:00-05:00']);
      expect(reading).toMatchObject({ problemCount: 0 });
      expect(reading.utcMs).toEqual([Date.UTC(2031, 0, 14, 21) + 123.456, Date.UTC(2031, 1, 14, 21), Date.UTC(2031, 1, 15, 3)]);
    });

    // In 2030 the clocks of Switzerland are put forward on 31 March at 01:00 UTC and back on 27 October at 01:00 UTC (IANA time zone database, rule EU).
    it('that were left out or came twice are problems of their rows, with what would be right', async () => {
      const spring = await local(['2030-03-31T01:59:59', '2030-03-31T02:00:00', '2030-03-31T02:59:59', '2030-03-31T03:00:00']);
      expect(spring.problems.map(({ row, message }) => [row, message])).toEqual([
        [3, expect.stringContaining('"2030-03-31T02:00:00" did not exist in Europe/Zurich')],
        [4, expect.stringContaining('did not exist')],
      ]);
      expect(spring.utcMs).toEqual([Date.UTC(2030, 2, 31, 0, 59, 59), Date.UTC(2030, 2, 31, 1)]);
      const autumn = await local(['2030-10-27T01:59:59', '2030-10-27T02:00:00', '2030-10-27T02:59:59+01:00', '2030-10-27T03:00:00']);
      expect(autumn.problems).toEqual([{ row: 3, column: 'time_utc', message: expect.stringContaining('+02:00 or +01:00') }]);
      expect(autumn.utcMs).toEqual([Date.UTC(2030, 9, 26, 23, 59, 59), Date.UTC(2030, 9, 27, 1, 59, 59), Date.UTC(2030, 9, 27, 2)]);
    });
  });

  it.each([
    ['utf-16le', (text: string) => Buffer.from(`\ufeff${text}`, 'utf16le')],
    ['utf-16be', (text: string) => Buffer.from(text, 'utf16le').swap16()],
    ['latin-1', (text: string) => Buffer.from(text, 'latin1')],
  ] as const)('reads %s, wherever the stream is cut', async (encoding, encode) => {
    const bytes = encode(`time;Ausschlag (µrad)\n${row(0, '1.5').replace(',', ';')}${row(1, 'x').replace(',', ';')}`);
    const reading = await readCsv(
      (async function* () {
        for (let from = 0; from < bytes.length; from += 3) yield bytes.subarray(from, from + 3);
      })(),
      { mapping: { ...mapping, encoding, delimiter: ';' }, limits },
    );
    expect(reading.rows).toBe(2);
    expect(reading.problems).toEqual([{ row: 3, column: 'Ausschlag (µrad)', message: expect.stringContaining('"x" is no number') }]);
  });

  it('gives back what was written, wherever the stream is cut and however lines end', async () => {
    const samples = fc.array(fc.double({ noNaN: true, noDefaultInfinity: true }), { minLength: 1, maxLength: 40 });
    await fc.assert(
      fc.asyncProperty(
        samples,
        fc.record({ size: fc.integer({ min: 1, max: 50 }), end: fc.constantFrom('\n', '\r\n'), quoted: fc.boolean() }),
        async (values, { size, end, quoted }) => {
          const quote = quoted ? '"' : '';
          const text = `\ufeff${header.trim()}${end}${values.map((value, index) => `${quote}${String(1_931_724_000 + index)}${quote},${String(value)}`).join(end)}`;
          const taken: number[] = [];
          const reading = await readCsv(pieces(text, size), {
            mapping: { ...mapping, timeFormat: 'epoch-s' },
            limits,
            take: async (batch) => void taken.push(...batch.value),
          });
          expect(reading.problems).toEqual([]);
          expect(taken).toEqual(values.map((value) => value + 0));
        },
      ),
      { numRuns: 200 },
    );
  });
});
