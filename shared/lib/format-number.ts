/**
 * Numbers as the SI Brochure (9th ed., 5.4) and the GUM (JCGM 100:2008, 7.2.2) write them: digits in groups of three
 * set apart by narrow no-break spaces, a true minus sign, the uncertainty in brackets in the last digits of the value.
 */

/** U+202F: keeps a number on one line and is narrower than a word space. */
export const NARROW_SPACE = '\u202f';
export const MINUS = '\u2212';

export type DecimalSign = '.' | ',';

export const SUPERSCRIPTS = '⁰¹²³⁴⁵⁶⁷⁸⁹';

/** `-11` → `⁻¹¹`. */
export function superscript(exponent: number): string {
  const digits = String(Math.abs(exponent)).replace(/\d/g, (digit) => SUPERSCRIPTS[Number(digit)] ?? digit);
  return exponent < 0 ? `⁻${digits}` : digits;
}

/** Digits in groups of three from the decimal sign outwards; no single digit is set apart (SI Brochure 5.4.4). */
function grouped(whole: string, fraction: string, sign: DecimalSign): string {
  const left = whole.length > 4 ? whole.replace(/\B(?=(\d{3})+$)/g, NARROW_SPACE) : whole;
  if (fraction === '') return left;
  return `${left}${sign}${fraction.replace(/(\d{3})(?=\d{2})/g, `$1${NARROW_SPACE}`)}`;
}

export interface FixedOptions {
  decimals: number;
  /** A plus sign before positive numbers. */
  signed?: boolean | undefined;
  decimalSign?: DecimalSign | undefined;
}

/** A number with a fixed count of decimals; zero never carries a minus. Not finite: an en dash. */
export function formatFixed(value: number, { decimals, signed = false, decimalSign = '.' }: FixedOptions): string {
  if (!Number.isFinite(value)) return '–';
  const [whole = '0', fraction = ''] = Math.abs(value).toFixed(decimals).split('.');
  const isZero = /^0*$/.test(whole + fraction);
  const prefix = isZero ? '' : value < 0 ? MINUS : signed ? '+' : '';
  return prefix + grouped(whole, fraction, decimalSign);
}

/** A number with `digits` significant digits, in plain notation. */
export function formatSignificant(value: number, digits: number, options: { signed?: boolean; decimalSign?: DecimalSign } = {}): string {
  if (!Number.isFinite(value)) return '–';
  if (value === 0) return formatFixed(0, { decimals: 0, ...options });
  const decade = Number(value.toExponential(digits - 1).split('e')[1]);
  return formatFixed(value, { decimals: Math.min(20, Math.max(0, digits - 1 - decade)), ...options });
}

/** A share from 0 to 1 in per cent with two significant digits: `0.38 %`, `71 %`. */
export function formatPercent(share: number, digits = 2): string {
  return `${formatSignificant(share * 100, digits)}${NARROW_SPACE}%`;
}

const UNIT_SIGNS: Record<string, string> = {
  urad: 'µrad',
  m3: 'm³',
  'kg.m2': `kg${NARROW_SPACE}m²`,
  deg: '°',
  degC: '°C',
  Cel: '°C',
  'N.m': `N${NARROW_SPACE}m`,
};

/** Unit of G. */
export const UNIT_OF_G = `m³${NARROW_SPACE}kg⁻¹${NARROW_SPACE}s⁻²`;

/** A unit of the rig document or of a channel as it is printed: `urad` → `µrad`. */
export function unitSign(unit: string): string {
  return UNIT_SIGNS[unit] ?? unit;
}

/** Value and unit with the space the SI asks for; none before the signs of plane angle (SI Brochure 5.4.3). */
export function withUnit(number: string, unit: string): string {
  const sign = unitSign(unit);
  if (sign === '') return number;
  return /^[°′″]$/.test(sign) ? `${number}${sign}` : `${number}${NARROW_SPACE}${sign}`;
}
