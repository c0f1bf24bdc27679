import * as fc from 'fast-check';
import { rangeOf, readingsWithin } from '@/shared/lib/reading-range';

const plain = (text: string) => text.replace(/\u202f/g, ' ');

test('least and greatest are those of the readings that are numbers, of a hundred thousand as of one', () => {
  expect(rangeOf([3, NaN, -2, Infinity, 7])).toEqual({ least: -2, greatest: 7 });
  expect(rangeOf([19.5])).toEqual({ least: 19.5, greatest: 19.5 });
  expect(rangeOf([])).toBeNull();
  expect(rangeOf([NaN, Infinity])).toBeNull();
  const many = Float64Array.from({ length: 300_000 }, (_, k) => Math.sin(k));
  expect(rangeOf(many)?.greatest).toBeCloseTo(1, 6);
});

test('readings have the decimals that tell them from each other', () => {
  const air = readingsWithin('°C', { least: 19.2, greatest: 19.25 });
  expect([19.2, 19.25].map(air).map(plain)).toEqual(['19.200 °C', '19.250 °C']);
  const pressure = readingsWithin('hPa', { least: 985, greatest: 1021 });
  expect(plain(pressure(1013.26))).toBe('1013 hPa');
});

test('where all readings are the same, or none is there, they are printed as single ones are', () => {
  expect(plain(readingsWithin('°C', { least: 19.5, greatest: 19.5 })(19.5))).toBe('19.50 °C');
  expect(plain(readingsWithin('°C', null)(19.5))).toBe('19.50 °C');
});

test('least and greatest never look the same while six decimals tell them apart', () => {
  fc.assert(
    fc.property(fc.double({ min: -1e4, max: 1e4, noNaN: true }), fc.double({ min: 1e-5, max: 1e4, noNaN: true }), (least, span) => {
      const greatest = least + span;
      const print = readingsWithin('', { least, greatest });
      expect(print(least)).not.toBe(print(greatest));
    }),
  );
});
