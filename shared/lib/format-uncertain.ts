import {
  type DecimalSign,
  formatFixed,
  formatSignificant,
  MINUS,
  NARROW_SPACE,
  superscript,
  SUPERSCRIPTS,
  withUnit,
} from './format-number';

export interface Uncertain {
  value: number;
  /** Standard uncertainty (k = 1), in the unit of the value; null where it is not known. */
  u: number | null;
  unit?: string | undefined;
}

/** The pieces of a printed result, so that a screen can set the uncertainty dimmer than the value. */
export interface UncertainParts {
  /** `6.674 30` */
  value: string;
  /** `(15)`; empty where u is zero or not known. */
  uncertainty: string;
  /** ` × 10⁻¹¹`; empty for exponent 0. */
  factor: string;
  /** ` m³ kg⁻¹ s⁻²` with the space before it; empty without a unit. */
  unit: string;
}

export interface UncertainOptions {
  /** Power of ten in front of the unit; chosen by size when absent. */
  exponent?: number | undefined;
  signed?: boolean | undefined;
  decimalSign?: DecimalSign | undefined;
}

const decadeOf = (x: number): number => Number(x.toExponential().split('e')[1]);

/** Decade of the last printed digit when u is rounded to two digits; 9.96 becomes 10, whose last digit stands one higher. */
function lastDecade(u: number): number {
  return Number(u.toExponential(1).split('e')[1]) - 1;
}

/** Plain notation is easy to read between a thousandth and a million, and only while u reaches below the decimal sign or near it. */
function chooseExponent(value: number, u: number): number {
  const size = Math.max(Math.abs(value), u);
  if (size === 0) return 0;
  const decade = decadeOf(size);
  const plain = decade >= -3 && decade < 6 && (u === 0 || lastDecade(u) <= 0);
  return plain ? 0 : decade;
}

function uncertaintyInBrackets(scaledU: number, decimals: number, sign: DecimalSign): string {
  const last = scaledU.toFixed(decimals);
  const crossesTheSign = decimals > 0 && scaledU >= 0.9995;
  // GUM 7.2.2: "100,021 47 (0,000 35)" is as good; with the sign inside, 12.3(1.5) cannot be read as 12.3(15 units of what?).
  if (crossesTheSign) return `(${last.replace('.', sign)})`;
  return `(${last.replace('.', '').replace(/^0+(?=\d)/, '')})`;
}

/**
 * A measured value with its standard uncertainty in brackets, u rounded to two digits (GUM 7.2.6), the value to the
 * same decimal place: `6.674 30(15) × 10⁻¹¹ m³ kg⁻¹ s⁻²`.
 */
export function uncertainParts({ value, u, unit = '' }: Uncertain, options: UncertainOptions = {}): UncertainParts {
  const sign = options.decimalSign ?? '.';
  const unitText = unit === '' ? '' : withUnit('', unit);
  if (!Number.isFinite(value)) return { value: '–', uncertainty: '', factor: '', unit: '' };
  const usableU = u !== null && Number.isFinite(u) && u > 0 ? u : 0;
  const exponent = options.exponent ?? chooseExponent(value, usableU);
  const factor = exponent === 0 ? '' : `${NARROW_SPACE}×${NARROW_SPACE}10${superscript(exponent)}`;
  // Decimal shifting by text keeps digits exact where dividing by a power of ten would not.
  const scale = (x: number) => shifted(x, -exponent);
  if (usableU === 0) {
    const text =
      u === 0
        ? shortest(scale(value), options)
        : formatSignificant(scale(value), 4, { signed: options.signed ?? false, decimalSign: sign });
    return { value: text, uncertainty: '', factor, unit: unitText };
  }
  const decimals = Math.min(20, Math.max(0, exponent - lastDecade(usableU)));
  const text = formatFixed(scale(value), { decimals, signed: options.signed, decimalSign: sign });
  return { value: text, uncertainty: uncertaintyInBrackets(scale(usableU), decimals, sign), factor, unit: unitText };
}

/** What stands behind a measured value whose u nobody knows: it is never printed as if it were exact. */
export const unknownU = ({ value, u }: Pick<Uncertain, 'value' | 'u'>): string =>
  u === null && Number.isFinite(value) ? ', u not known' : '';

/** {@link uncertainParts} as one string; where u is not known, it says so. */
export function formatUncertain(quantity: Uncertain, options: UncertainOptions = {}): string {
  return joined(uncertainParts(quantity, options)) + unknownU(quantity);
}

/** A number that is not measured but worked out, such as a contribution to u or a change, in the same notation to four digits. */
export const formatExact = (quantity: Omit<Uncertain, 'u'>, options: UncertainOptions = {}): string =>
  joined(uncertainParts({ ...quantity, u: null }, options));

const joined = (parts: UncertainParts): string => parts.value + parts.uncertainty + parts.factor + parts.unit;

/** The same in words for a screen reader, which would read brackets and superscripts as noise. */
export function spokenUncertain(quantity: Uncertain, options: UncertainOptions = {}): string {
  const { value, u } = quantity;
  const usableU = u !== null && u > 0 ? u : 0;
  const exponent = options.exponent ?? chooseExponent(value, usableU);
  const parts = uncertainParts(quantity, { ...options, exponent });
  const plain = parts.value.replaceAll(NARROW_SPACE, '').replace(MINUS, 'minus ').replace('+', 'plus ');
  const decimals = Math.min(20, Math.max(0, exponent - (usableU > 0 ? lastDecade(usableU) : 0)));
  const plusMinus = usableU > 0 ? ` plus or minus ${shifted(usableU, -exponent).toFixed(decimals)}` : '';
  const power = exponent === 0 ? '' : `, times ten to the power of ${String(exponent).replace('-', 'minus ')}`;
  return `${plain}${plusMinus}${power}${parts.unit.replaceAll(NARROW_SPACE, ' ')}${unknownU(quantity)}`;
}

function shifted(x: number, decades: number): number {
  const [mantissa = '0', exponent = '0'] = x.toExponential().split('e');
  return Number(`${mantissa}e${Number(exponent) + decades}`);
}

function shortest(value: number, options: UncertainOptions): string {
  const digits = value.toString().includes('e') ? 4 : (value.toString().split('.')[1]?.length ?? 0);
  return formatFixed(value, { decimals: Math.min(12, digits), signed: options.signed, decimalSign: options.decimalSign });
}

const PATTERN =
  /^([+\u2212-]?[\d\u202f ]+(?:[.,][\d\u202f ]+)?)(?:\(([\d.,]+)\))?(?:[\u202f ]*×[\u202f ]*10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+))?(?:[\u202f ]*(\D.*?))?(?:, u not known)?$/u;

/**
 * Reads what {@link formatUncertain} wrote.
 * @throws RangeError naming the text when it is not a number in that notation.
 */
export function parseUncertain(text: string): { value: number; u: number | null; unit: string } {
  const match = PATTERN.exec(text.trim());
  if (!match?.[1]) throw new RangeError(`"${text}" is not a number with an uncertainty; 6.674 30(15) × 10⁻¹¹ would be one`);
  const exponent = match[3] ? fromSuperscript(match[3]) : 0;
  const digits = plainDigits(match[1]);
  const decimals = digits.split('.')[1]?.length ?? 0;
  const bracket = match[2] ? plainDigits(match[2]) : null;
  const inBrackets = bracket === null ? null : bracket.includes('.') ? Number(bracket) : shifted(Number(bracket), -decimals);
  return {
    value: shifted(Number(digits), exponent),
    u: inBrackets === null ? null : shifted(inBrackets, exponent),
    unit: (match[4] ?? '').trim(),
  };
}

function plainDigits(text: string): string {
  return text
    .replace(/[\u202f ]/g, '')
    .replace(MINUS, '-')
    .replace(',', '.');
}

function fromSuperscript(text: string): number {
  const digits = text.replace('⁻', '-').replace(/[⁰¹²³⁴⁵⁶⁷⁸⁹]/g, (digit) => String(SUPERSCRIPTS.indexOf(digit)));
  return Number(digits);
}
