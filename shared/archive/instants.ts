/** UTC instants in archives: ISO 8601 with `Z`, read to the microsecond and better, written with six decimals. */

const msPerDay = 86_400_000;

/** `2026-03-01T22:00:00.123456Z` for UTC milliseconds with fraction. */
export function formatInstant(utcMs: number): string {
  const micros = Math.round((utcMs - Math.floor(utcMs / 1000) * 1000) * 1000);
  const wholeMs = Math.floor(utcMs / 1000) * 1000 + (micros === 1_000_000 ? 1000 : 0);
  const fraction = String(micros === 1_000_000 ? 0 : micros).padStart(6, '0');
  return `${new Date(wholeMs).toISOString().slice(0, 19)}.${fraction}Z`;
}

/** UTC milliseconds of an ISO 8601 instant that ends in `Z`; NaN when it is none. */
export function parseInstant(text: string): number {
  return instantReader()(text);
}

/** A reader for many instants: remembers the day it last saw, so a column of times is read at a few ns a character. */
export function instantReader(): (text: string) => number {
  let day = '';
  let dayMs = NaN;
  return (text) => {
    const length = text.length;
    if (length < 20 || text.charCodeAt(length - 1) !== 90 || text.charCodeAt(10) !== 84) return NaN;
    const textDay = text.slice(0, 10);
    if (textDay !== day) {
      day = textDay;
      dayMs = startOfDay(textDay);
    }
    const hours = twoDigits(text, 11);
    const minutes = twoDigits(text, 14);
    const seconds = twoDigits(text, 17);
    if (text.charCodeAt(13) !== 58 || text.charCodeAt(16) !== 58 || !(hours < 24) || !(minutes < 60) || !(seconds < 60)) return NaN;
    return dayMs + ((hours * 60 + minutes) * 60 + seconds) * 1000 + fractionMs(text, length - 1);
  };
}

function startOfDay(day: string): number {
  const match = /^(\d{4})-(\d{2})-(\d{2})$/.exec(day);
  if (match === null) return NaN;
  const ms = Date.UTC(Number(match[1]), Number(match[2]) - 1, Number(match[3]));
  return ms % msPerDay === 0 && new Date(ms).toISOString().slice(0, 10) === day ? ms : NaN;
}

function twoDigits(text: string, at: number): number {
  const tens = text.charCodeAt(at) - 48;
  const ones = text.charCodeAt(at + 1) - 48;
  return tens >= 0 && tens <= 9 && ones >= 0 && ones <= 9 ? tens * 10 + ones : NaN;
}

/** The part after the seconds, ms; NaN unless it is empty or a decimal point with digits. */
function fractionMs(text: string, end: number): number {
  if (end === 19) return 0;
  const separator = text.charCodeAt(19);
  if ((separator !== 46 && separator !== 44) || end === 20) return NaN;
  let digits = 0;
  let scale = 1;
  for (let at = 20; at < end; at += 1) {
    const digit = text.charCodeAt(at) - 48;
    if (digit < 0 || digit > 9) return NaN;
    if (scale < 1e15) {
      digits = digits * 10 + digit;
      scale *= 10;
    }
  }
  return (digits / scale) * 1000;
}
