import { parse } from 'csv-parse/sync';
import * as fc from 'fast-check';
import { BrokenTable, recordsOf, type LineRecord } from '@/server/ingest/csv-lines';

async function* pieces(text: string, size: number): AsyncGenerator<string> {
  for (let from = 0; from < text.length; from += size) yield text.slice(from, from + size);
}

async function read(text: string, delimiter: string, size: number) {
  const found: LineRecord[] = [];
  for await (const records of recordsOf(pieces(text, size), delimiter)) found.push(...records);
  return found.map(({ record, line }) => ({ record: record.map((field) => field.trim()), line }));
}

/** The same by the parser alone, which reads every file. */
function plainly(text: string, delimiter: string) {
  const rows = parse(text, {
    delimiter,
    info: true,
    relax_column_count: true,
    relax_quotes: true,
    skip_empty_lines: true,
    comment: '#',
    comment_no_infix: true,
    trim: true,
  }) as unknown as { record: string[]; info: { lines: number } }[];
  return rows.map(({ record, info }) => ({ record, line: info.lines }));
}

const field = fc.oneof(
  { weight: 8, arbitrary: fc.constantFrom('1', '-2.5e3', '2031-03-14T22:00:00Z', '', ' 7 ', 'é', 'x # no', 'a b') },
  { weight: 1, arbitrary: fc.constantFrom('"1"', '"a, b"', '"two\nlines"', '"say ""so"""') },
);
const tables = fc
  .record({
    delimiter: fc.constantFrom(',', ';', '\t'),
    end: fc.constantFrom('\n', '\r\n', '\r'),
    lines: fc.array(
      fc.oneof(
        { weight: 9, arbitrary: fc.array(field, { minLength: 2, maxLength: 3 }) },
        { weight: 1, arbitrary: fc.constantFrom(['# remark'], ['']) },
      ),
      {
        minLength: 1,
        maxLength: 9,
      },
    ),
    last: fc.boolean(),
  })
  .map(({ delimiter, end, lines, last }) => ({ delimiter, text: lines.map((line) => line.join(delimiter)).join(end) + (last ? end : '') }));

test('records and their lines are those of the parser, wherever the text is cut and the first quotation mark stands', async () => {
  await fc.assert(
    fc.asyncProperty(tables, fc.integer({ min: 1, max: 60 }), async ({ text, delimiter }, size) => {
      expect(await read(text, delimiter, size)).toEqual(plainly(text, delimiter));
    }),
    { numRuns: 400 },
  );
});

test('what is wrong with the table as a whole is told with its line of the file, after the records before', async () => {
  const found: LineRecord[] = [];
  const reading = (async () => {
    for await (const records of recordsOf(pieces('1,2\n3,4\n5,"6\n7,8\n', 6), ',')) found.push(...records);
  })();
  await expect(reading).rejects.toMatchObject({ message: 'a quotation mark is opened and never closed' });
  await expect(reading).rejects.toBeInstanceOf(BrokenTable);
  expect(found.map(({ line }) => line)).toEqual([1, 2]);
  await expect(read('x'.repeat(1_000_002), ',', 65_536)).rejects.toThrow('longer than a million characters');
});

test('a source that breaks off breaks the reading off, in plain lines and in quoted ones', async () => {
  const broken = async function* (text: string) {
    yield text;
    throw new Error('the source broke off');
  };
  for (const text of ['1,2\n3', '1,"2"\n3']) {
    const reading = (async () => {
      for await (const records of recordsOf(broken(text), ',')) expect(records.length).toBeGreaterThan(0);
    })();
    await expect(reading).rejects.toThrow('the source broke off');
  }
});
