import { GREATEST_POSITION, GREATEST_RATE, type Limits } from './messages';

/**
 * Readers of single fields (SPEC 2.1, 2.3). Each gives the value, or undefined for anything that is not exactly in
 * the form and range that the specification asks for.
 */

/** The bytes a body may consist of (SPEC 1.3), by character code. */
export const ALPHABET: Uint8Array = (() => {
  const allowed = new Uint8Array(256);
  for (const character of 'abcdefghijklmnopqrstuvwxyz0123456789ABCDEF -.') allowed[character.charCodeAt(0)] = 1;
  return allowed;
})();

const ZERO = 48;
const NINE = 57;

function digits(text: string, from: number, to: number): number | undefined {
  if (to <= from) return undefined;
  let value = 0;
  for (let index = from; index < to; index += 1) {
    const code = text.charCodeAt(index);
    if (code < ZERO || code > NINE) return undefined;
    value = value * 10 + (code - ZERO);
  }
  return value;
}

/** A whole number 0…greatest without leading zeros. */
export function wholeField(text: string | undefined, greatest: number): number | undefined {
  if (text === undefined || text.length > 10 || (text.length > 1 && text.charCodeAt(0) === ZERO)) return undefined;
  const value = digits(text, 0, text.length);
  return value === undefined || value > greatest ? undefined : value;
}

export const GREATEST_EPOCH = 4_294_967_295;
export const GREATEST_NUMBER = 65_535;

export function positionField(text: string | undefined): number | undefined {
  if (text === undefined) return undefined;
  if (text.charCodeAt(0) !== 45) return wholeField(text, GREATEST_POSITION);
  const size = wholeField(text.slice(1), GREATEST_POSITION);
  return size === undefined || size === 0 ? undefined : -size;
}

/** A position, or null for `none`. */
export function placeField(text: string | undefined): number | null | undefined {
  return text === 'none' ? null : positionField(text);
}

/** Speed or acceleration, 1…99999999. */
export function rateField(text: string | undefined): number | undefined {
  const value = wholeField(text, GREATEST_RATE);
  return value === 0 ? undefined : value;
}

/** Five fields from `from` on: the travel limits, the caps and the home speed (SPEC 5.6). */
export function limitFields(fields: readonly string[], from: number): Limits | undefined {
  const least = positionField(fields[from]);
  const greatest = positionField(fields[from + 1]);
  const speed = rateField(fields[from + 2]);
  const acceleration = rateField(fields[from + 3]);
  const home = rateField(fields[from + 4]);
  if (least === undefined || greatest === undefined || speed === undefined || acceleration === undefined || home === undefined)
    return undefined;
  return { least, greatest, speed, acceleration, home };
}

/** Exactly `length` hexadecimal digits in upper case, as they stand. */
function hexField(text: string | undefined, length: number): string | undefined {
  if (text === undefined || text.length !== length) return undefined;
  for (let index = 0; index < length; index += 1) {
    const code = text.charCodeAt(index);
    if (!((code >= ZERO && code <= NINE) || (code >= 65 && code <= 70))) return undefined;
  }
  return text;
}

export const identifierField = (text: string | undefined) => hexField(text, 8);

export function hexNumberField(text: string | undefined, length: number): number | undefined {
  const hex = hexField(text, length);
  return hex === undefined ? undefined : Number.parseInt(hex, 16);
}

/** A stamp (SPEC 2.3) in microseconds. */
export function stampField(text: string | undefined): number | undefined {
  if (text === undefined || text.length !== 16 || text.charCodeAt(9) !== 46) return undefined;
  const seconds = digits(text, 0, 9);
  const rest = digits(text, 10, 16);
  return seconds === undefined || rest === undefined ? undefined : seconds * 1_000_000 + rest;
}

/** Exactly six digits. */
export function turnField(text: string | undefined): number | undefined {
  return text === undefined || text.length !== 6 ? undefined : digits(text, 0, 6);
}

export function choiceField<const T extends string>(text: string | undefined, choices: readonly T[]): T | undefined {
  return choices.find((choice) => choice === text);
}
