/** Round numbers for axes. Pure. */

const roundSteps = [1, 2, 2.5, 5, 10];

/** A round step such that about `count` of them fill the span. */
function niceStep(span: number, count: number): number {
  if (!(span > 0)) return 1;
  const raw = span / Math.max(1, count);
  const decade = 10 ** Math.floor(Math.log10(raw));
  return decade * (roundSteps.find((step) => step * decade >= raw * 0.999_999) ?? 10);
}

const greatestIndex = 1e12;

/** Round values within [from, to], about `count` of them, and the decimals they need. */
export function niceTicks(from: number, to: number, count: number): { values: number[]; decimals: number } {
  const step = niceStep(to - from, count);
  const first = Math.ceil(from / step - 1e-9);
  const last = Math.floor(to / step + 1e-9);
  // Closer to each other than numbers of this size can be told apart.
  if (Math.max(Math.abs(first), Math.abs(last)) > greatestIndex) return { values: [], decimals: 0 };
  const values = Array.from({ length: Math.max(0, last - first + 1) }, (_, k) => (first + k === 0 ? 0 : (first + k) * step));
  const twoDigits = Math.abs(step / 10 ** Math.floor(Math.log10(step)) - 2.5) < 1e-9;
  return { values, decimals: Math.max(0, -Math.floor(Math.log10(step) + 1e-9) + (twoDigits ? 1 : 0)) };
}

/** Round values of a logarithmic axis from 10^from to 10^to, as logarithms: 1, 2, 5, … or, over two decades and more, powers of ten. */
export function logTicks(from: number, to: number): number[] {
  const digits = to - from > 2 ? [1] : [1, 2, 5];
  const decades = Array.from({ length: Math.floor(to) - Math.floor(from) + 1 }, (_, k) => Math.floor(from) + k);
  return decades.flatMap((decade) => digits.map((digit) => decade + Math.log10(digit))).filter((at) => at >= from && at <= to);
}
