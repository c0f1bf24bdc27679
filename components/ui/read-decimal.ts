/** A number as people type it: decimal point or comma, spaces between groups, a true minus sign. Null when it is none. */
export function readDecimal(text: string): number | null {
  const plain = text
    .replace(/[\s\u202f\u00a0]/g, '')
    .replace(/\u2212/g, '-')
    .replace(',', '.');
  if (!/^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i.test(plain)) return null;
  const value = Number(plain);
  return Number.isFinite(value) ? value : null;
}
