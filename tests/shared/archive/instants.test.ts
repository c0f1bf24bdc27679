import { formatInstant, instantReader, parseInstant } from '@/shared/archive/instants';

describe('instants', () => {
  test('are written with microseconds and a Z', () => {
    expect(formatInstant(Date.UTC(2026, 2, 1, 22, 0, 0) + 123.456)).toBe('2026-03-01T22:00:00.123456Z');
    expect(formatInstant(Date.UTC(2026, 11, 31, 23, 59, 59) + 999.9999)).toBe('2027-01-01T00:00:00.000000Z');
    expect(formatInstant(Date.UTC(1999, 11, 31, 23, 59, 59) + 0.5)).toBe('1999-12-31T23:59:59.000500Z');
  });

  test('are read with any number of decimals', () => {
    expect(parseInstant('2000-01-01T00:00:00Z')).toBe(Date.UTC(2000, 0, 1));
    expect(parseInstant('2000-01-01T00:00:00.050Z')).toBe(Date.UTC(2000, 0, 1) + 50);
    expect(parseInstant('2000-01-01T00:00:01.123456789012Z')).toBeCloseTo(Date.UTC(2000, 0, 1) + 1123.456789, 3);
  });

  test('come back from their text to the microsecond', () => {
    for (const ms of [946684800000.05, 1772402399999.999, 1.5]) expect(Math.abs(parseInstant(formatInstant(ms)) - ms)).toBeLessThan(6e-4);
  });

  test.each([
    '',
    '2000-01-01',
    '2000-01-01T00:00:00',
    '2000-01-01T00:00:00+00:00',
    '2000-01-01 00:00:00Z',
    '2000-02-30T00:00:00Z',
    '2000-01-01T24:00:00Z',
    '2000-01-01T00:61:00Z',
    '2000-01-01T00:00:00.Z',
    '2000-01-01T00:00:0xZ',
    '1772402400',
  ])('refuse %p', (text) => {
    expect(parseInstant(text)).toBeNaN();
  });

  test('a reader for a column goes on over midnight and over a bad row', () => {
    const read = instantReader();
    expect(read('2000-01-01T23:59:59.9Z')).toBe(Date.UTC(2000, 0, 1, 23, 59, 59, 900));
    expect(read('rubbish')).toBeNaN();
    expect(read('2000-01-02T00:00:00.1Z')).toBe(Date.UTC(2000, 0, 2) + 100);
  });
});
