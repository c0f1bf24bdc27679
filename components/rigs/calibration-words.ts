import { formatSignificant, unitSign } from '@/shared/lib/format-number';
import { formatUncertain } from '@/shared/lib/format-uncertain';
import type { Calibration } from '@/shared/statistics/calibration';

/** A number whose u is 0 has none to show. */
const known = (value: number, u: number, unit?: string) =>
  u > 0 ? formatUncertain({ value, u, unit }) : `${formatSignificant(value, 6)}${unit === undefined ? '' : ` ${unit}`}`;

/** Correlation coefficient of offset and slope; null where one of them has no u. */
export const correlationOf = ({ uOffset, uSlope, covariance }: Calibration): number | null =>
  uOffset > 0 && uSlope > 0 ? covariance / (uOffset * uSlope) : null;

/** A calibration in words: `0.12(3) mm + 1.0020(5) · reading, correlation −0.93`. */
export function calibrationWords(calibration: Calibration, unit: string): string {
  const { offset, slope, uOffset, uSlope } = calibration;
  const r = correlationOf(calibration);
  return `${known(offset, uOffset, unitSign(unit))} + ${known(slope, uSlope)} · reading${r === null ? '' : `, correlation ${formatSignificant(r, 2)}`}`;
}
