import * as fc from 'fast-check';
import { formatDeflection, formatDeflectionUncertain, formatDegrees } from '@/shared/lib/format-angle';
import {
  formatAgo,
  formatCountdown,
  formatCountdownWide,
  formatDelay,
  formatDuration,
  formatTimeUncertainty,
} from '@/shared/lib/format-duration';
import { formatFixed, formatPercent, formatSignificant, UNIT_OF_G } from '@/shared/lib/format-number';
import { formatClock, formatClockWithZone, formatDay, formatLocalHonest, formatUtcHonest, zoneOffsetMs } from '@/shared/lib/format-time';
import { formatExact, formatUncertain, parseUncertain, spokenUncertain } from '@/shared/lib/format-uncertain';

const plain = (text: string) => text.replaceAll('\u202f', ' ');

describe('a value with its uncertainty', () => {
  test('is written as CODATA 2022 prints G', () => {
    // NIST, CODATA 2022 recommended values: 6.674 30(15) x 10^-11 m3 kg-1 s-2
    expect(formatUncertain({ value: 6.6743e-11, u: 0.00015e-11, unit: UNIT_OF_G })).toBe(
      '6.674\u202f30(15)\u202f×\u202f10⁻¹¹\u202fm³\u202fkg⁻¹\u202fs⁻²',
    );
  });

  test.each([
    // NIST, CODATA 2022: electron mass, fine-structure constant, proton-electron mass ratio
    [9.1093837139e-31, 0.0000000028e-31, 'kg', '9.109 383 7139(28) × 10⁻³¹ kg'],
    [7.2973525643e-3, 0.0000000011e-3, '', '0.007 297 352 5643(11)'],
    [1836.152673426, 0.000000032, '', '1836.152 673 426(32)'],
    // GUM 7.2.2, the example of the 100 g standard
    [100.02147, 0.00035, 'g', '100.021 47(35) g'],
  ])('%d ± %d %s', (value, u, unit, expected) => {
    expect(plain(formatUncertain({ value, u, unit }))).toBe(expected);
  });

  test('rounds u to two digits and the value to the same place', () => {
    expect(plain(formatUncertain({ value: 6.66812e-11, u: 0.02949e-11 }))).toBe('6.668(29) × 10⁻¹¹');
    expect(plain(formatUncertain({ value: 1.23456, u: 0.00996 }))).toBe('1.235(10)');
    expect(plain(formatUncertain({ value: 12.34, u: 1.52, unit: 'µrad' }))).toBe('12.3(1.5) µrad');
    expect(plain(formatUncertain({ value: 420.06, u: 12.4, unit: 's' }))).toBe('420(12) s');
    expect(plain(formatUncertain({ value: 123456, u: 1520 }))).toBe('1.235(15) × 10⁵');
  });

  test('an exact value has no brackets, one without u has four digits', () => {
    expect(formatUncertain({ value: 0.5, u: 0 })).toBe('0.5');
    expect(plain(formatUncertain({ value: 6.66812e-11, u: null, unit: 'm' }))).toBe('6.668 × 10⁻¹¹ m, u not known');
    expect(spokenUncertain({ value: 6.66812, u: null, unit: 'm' })).toContain('u not known');
    expect(plain(formatExact({ value: 6.66812e-11, unit: 'm' }))).toBe('6.668 × 10⁻¹¹ m');
    expect(parseUncertain(formatUncertain({ value: 6.66812e-11, u: null, unit: 'm' }))).toEqual({ value: 6.668e-11, u: null, unit: 'm' });
  });

  test('takes a decimal comma', () => {
    expect(plain(formatUncertain({ value: 2.3741, u: 0.0041, unit: 'mrad' }, { decimalSign: ',' }))).toBe('2,3741(41) mrad');
  });

  test('what is printed reads back within half a last digit', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -1, max: 1, noNaN: true }),
        fc.integer({ min: -30, max: 20 }),
        fc.double({ min: 1e-9, max: 3, noNaN: true }),
        (mantissa, exponent, relative) => {
          const value = mantissa * 10 ** exponent;
          const u = Math.max(Math.abs(value), 1e-30) * relative;
          const read = parseUncertain(formatUncertain({ value, u, unit: 'kg' }));
          expect(read.unit).toBe('kg');
          expect(Math.abs((read.u ?? 0) - u)).toBeLessThanOrEqual(u * 0.0501);
          expect(Math.abs(read.value - value)).toBeLessThanOrEqual(u * 0.0501);
        },
      ),
    );
  });

  test('refuses to read what is no number', () => {
    expect(() => parseUncertain('about six')).toThrow('is not a number with an uncertainty');
  });

  test('is spoken without brackets', () => {
    expect(spokenUncertain({ value: 6.6743e-11, u: 0.00015e-11, unit: UNIT_OF_G })).toBe(
      '6.67430 plus or minus 0.00015, times ten to the power of minus 11 m³ kg⁻¹ s⁻²',
    );
  });
});

describe('plain numbers', () => {
  test('have a true minus, groups of three, and no minus zero', () => {
    expect(formatFixed(-12345.678912, { decimals: 6 })).toBe('\u221212\u202f345.678\u202f912');
    expect(formatFixed(-0.001, { decimals: 2 })).toBe('0.00');
    expect(formatFixed(1.5, { decimals: 1, signed: true })).toBe('+1.5');
    expect(formatFixed(NaN, { decimals: 1 })).toBe('–');
    expect(formatSignificant(0.003812, 2)).toBe('0.0038');
    expect(plain(formatPercent(0.0041))).toBe('0.41 %');
    expect(plain(formatPercent(0.713))).toBe('71 %');
  });
});

describe('lengths of time', () => {
  test('a countdown rounds up and never goes below nought', () => {
    expect(formatCountdown(372)).toBe('6:12');
    expect(formatCountdown(371.2)).toBe('6:12');
    expect(formatCountdown(3729)).toBe('1:02:09');
    expect(formatCountdown(-4)).toBe('0:00');
    expect(formatCountdownWide(372)).toBe('06:12');
  });

  test('a duration shows its two leading units', () => {
    expect(plain(formatDuration(33_060))).toBe('9 h 11 min');
    expect(plain(formatDuration(830))).toBe('13 min 50 s');
    expect(plain(formatDuration(12.5))).toBe('12.5 s');
    expect(plain(formatDuration(59.97))).toBe('1 min');
    expect(plain(formatDuration(3599.7))).toBe('1 h');
    expect(plain(formatDuration(202_620))).toBe('2 d 8 h');
    expect(plain(formatDuration(-20))).toBe('−20 s');
  });

  test('delays, ages and uncertainties', () => {
    expect(plain(formatDelay(0.0031))).toBe('+3 ms');
    expect(plain(formatDelay(-0.42))).toBe('−420 ms');
    expect(plain(formatDelay(242))).toBe('+4 min 2 s');
    expect(formatDelay(0.0001)).toBe('on time');
    expect(plain(formatAgo(12.9))).toBe('12 s ago');
    expect(plain(formatTimeUncertainty(0.00021))).toBe('± 0.21 ms');
    expect(plain(formatTimeUncertainty(0.0000153))).toBe('± 15 µs');
    expect(plain(formatTimeUncertainty(0.0012))).toBe('± 1.2 ms');
    expect(plain(formatTimeUncertainty(1.25))).toBe('± 1.3 s');
  });
});

describe('instants', () => {
  const summer = Date.UTC(2031, 6, 10, 3, 46, 12, 231);

  test('local time is that of the named zone, daylight saving included', () => {
    expect(formatClock(summer, { timeZone: 'Europe/Oslo' })).toBe('05:46');
    expect(formatClock(Date.UTC(2031, 0, 10, 3, 46), { timeZone: 'Europe/Oslo' })).toBe('04:46');
    expect(formatClock(summer, { timeZone: 'Europe/Oslo', precision: 'ms', weekday: true })).toBe('05:46:12.231 Thu');
    expect(formatClockWithZone(summer, { timeZone: 'America/St_Johns' })).toBe('01:16, America/St Johns');
    expect(formatDay(Date.UTC(2031, 6, 10, 23, 30), 'Europe/Oslo')).toBe('2031-07-11');
  });

  test('UTC shows no finer digits than u bears', () => {
    const instant = Date.UTC(2031, 6, 10, 5, 32, 40, 218) + 0.6;
    expect(plain(formatUtcHonest(instant, 0.00021))).toBe('05:32:40.218 60');
    expect(plain(formatUtcHonest(instant, 0.0015))).toBe('05:32:40.218 6');
    expect(plain(formatLocalHonest(instant, 0.0015, 'Asia/Kolkata'))).toBe('11:02:40.218 6');
    expect(zoneOffsetMs(instant, 'America/St_Johns')).toBe(-2.5 * 3_600_000);
    expect(formatUtcHonest(instant, 1.5)).toBe('05:32:40.2');
    expect(formatUtcHonest(instant, 20)).toBe('05:32:40');
    expect(formatUtcHonest(Date.UTC(2031, 6, 10, 23, 59, 59, 999), 20)).toBe('00:00:00');
  });
});

describe('angles', () => {
  test('degrees for the turntable, mrad or µrad for the pendulum', () => {
    expect(formatDegrees(-20.179)).toBe('\u221220.18°');
    expect(plain(formatDeflection(0.0011874))).toBe('+1.187 mrad');
    expect(plain(formatDeflection(-12.44e-6))).toBe('−12.4 µrad');
    expect(plain(formatDeflectionUncertain({ value: 0.0023741, u: 0.0000041 }))).toBe('2.3741(41) mrad');
  });
});
