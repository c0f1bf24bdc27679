import * as fc from 'fast-check';
import type { ImportMapping } from '@/shared/contracts/data';

/** Files of every kind, good ones and broken ones, and mappings that fit them or do not. */

const number = fc.oneof(
  fc.double().map(String),
  fc.integer().map(String),
  fc.constantFrom('1,5', '1.234,5', "1'000", '', 'NaN', '-inf', '+.5', '1e999', '0x10', '٣'),
);
const time = fc.oneof(
  fc.integer({ min: 0, max: 9e8 }).map((s) => new Date(Date.UTC(2010, 0) + s * 1000).toISOString()),
  fc.integer({ min: 0, max: 2e9 }).map(String),
  fc.constantFrom(
    ...['2030-03-31 02:30', '2030-10-27T02:30:00', '2031-02-30T00:00:00Z', '14.3.2031 22:00', '9999-99-99T99:99:99Z'],
    ...['2031-03-14T22:00:00+99:99', '2031-03-14T22:00:00,5', 'Z'],
  ),
);
const noise = fc.string({
  unit: fc.constantFrom(',', ';', '"', "'", '\n', '\r', '\t', '\u0000', '\ufeff', '#', 'é', '𝛼', ' ', '1', '-', '.'),
  maxLength: 12,
});
const field = fc.oneof({ weight: 4, arbitrary: number }, { weight: 4, arbitrary: time }, { weight: 1, arbitrary: noise });
const quoted = field.chain((text) => fc.constantFrom(text, `"${text}"`, `"${text}`, `"${text.replaceAll('"', '""')}"`));
const text = fc
  .record({
    mark: fc.constantFrom('', '', '\ufeff'),
    sign: fc.constantFrom(',', ';', '\t', '|', ' ', '^'),
    end: fc.constantFrom('\n', '\r\n', '\r', '\n\n'),
    rows: fc.array(fc.array(quoted, { minLength: 1, maxLength: 4 }), { maxLength: 8 }),
  })
  .map(({ mark, sign, end, rows }) => mark + rows.map((row) => row.join(sign)).join(end));
const encodings = {
  'utf-8': (words: string) => Buffer.from(words),
  'utf-16le': (words: string) => Buffer.from(words, 'utf16le'),
  'utf-16be': (words: string) => Buffer.from(words, 'utf16le').swap16(),
  'latin-1': (words: string) => Buffer.from(words, 'latin1'),
};
export const bytes = fc.oneof(
  { weight: 9, arbitrary: fc.tuple(text, fc.constantFrom(...Object.values(encodings))).map(([words, encode]) => encode(words)) },
  { weight: 1, arbitrary: fc.uint8Array({ maxLength: 60 }).map((raw) => Buffer.from(raw)) },
);
export const mappings: fc.Arbitrary<ImportMapping> = fc.record(
  {
    encoding: fc.constantFrom('utf-8', 'utf-16le', 'utf-16be', 'latin-1'),
    delimiter: fc.constantFrom(',', ';', '\t', '|', ' ', '^'),
    decimal: fc.constantFrom('.', ','),
    headerRow: fc.boolean(),
    timeColumn: fc.nat(2),
    timeFormat: fc.constantFrom('iso', 'epoch-s', 'epoch-ms', 'elapsed-s'),
    elapsedFrom: fc.constant('2031-03-14T22:00:00Z'),
    timeZone: fc.constantFrom('Europe/Zurich', 'Australia/Lord_Howe', 'UTC'),
    valueColumn: fc.nat(2),
    unit: fc.constantFrom('rad', 'mm'),
  },
  { requiredKeys: ['delimiter', 'decimal', 'headerRow', 'timeColumn', 'timeFormat', 'valueColumn', 'unit', 'elapsedFrom'] },
);
