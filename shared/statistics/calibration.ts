/** What a reading truly says, as a straight line: value = offset + slope · reading, and what is known of the line (JCGM 100:2008, H.3). */
export interface Calibration {
  offset: number;
  slope: number;
  /** Standard uncertainties, and the covariance of the two. */
  uOffset: number;
  uSlope: number;
  covariance: number;
}

export const calibrated = ({ offset, slope }: Calibration, reading: number): number => offset + slope * reading;

/** Standard uncertainty that the calibration leaves in the value of a reading (JCGM 100:2008, H.3.4); the reading's own is not in it. */
export function uCalibrated({ uOffset, uSlope, covariance }: Calibration, reading: number): number {
  return Math.sqrt(Math.max(0, uOffset * uOffset + reading * (2 * covariance + reading * uSlope * uSlope)));
}

/** The same for a value that was calibrated already. */
export const uOfCalibrated = (calibration: Calibration, value: number): number =>
  uCalibrated(calibration, (value - calibration.offset) / calibration.slope);

/** Why these figures cannot be a calibration; null where they can. */
export function calibrationFault({ slope, uOffset, uSlope, covariance }: Calibration): string | null {
  if (slope === 0) return 'A slope of 0 makes the same of every reading.';
  // Correlation coefficients lie between −1 and 1; what is rounded may lie a little beyond.
  return Math.abs(covariance) > uOffset * uSlope * (1 + 1e-6) + Number.MIN_VALUE
    ? 'The covariance is greater than the product of both uncertainties; their correlation would be beyond 1.'
    : null;
}
