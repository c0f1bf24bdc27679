import type { Calibration } from '../statistics/calibration';

/** The scale in the picture: which column shows which millimetre. */

export interface Mark {
  /** Column of the picture, px. */
  px: number;
  /** What the scale says there, mm. */
  mm: number;
}

/** mm = meanMm + mmPerPx · (px − meanPx). */
export interface SpotScale {
  meanPx: number;
  meanMm: number;
  mmPerPx: number;
  /** Standard uncertainties; about the mean of the marks the two are independent. */
  uMeanMm: number;
  uMmPerPx: number;
  /** Reading minus line at each mark, mm. */
  residualsMm: number[];
  /** Standard deviation of a mark from the residuals, mm; null with two marks, which always lie on a line. */
  scatterMm: number | null;
}

/**
 * Least squares of the marks' mm on their px. Each mark has the standard uncertainty `uMarkMm`, or that which the residuals show where it is greater.
 * Null where fewer than two different columns are marked, or the scale would not change along the picture.
 */
export function fitScale(marks: readonly Mark[], uMarkMm: number): SpotScale | null {
  const count = marks.length;
  if (count < 2) return null;
  const meanPx = marks.reduce((sum, { px }) => sum + px, 0) / count;
  const meanMm = marks.reduce((sum, { mm }) => sum + mm, 0) / count;
  const square = marks.reduce((sum, { px }) => sum + (px - meanPx) ** 2, 0);
  if (!(square > 0.5)) return null;
  const mmPerPx = marks.reduce((sum, { px, mm }) => sum + (px - meanPx) * (mm - meanMm), 0) / square;
  if (mmPerPx === 0) return null;
  const residualsMm = marks.map(({ px, mm }) => mm - meanMm - mmPerPx * (px - meanPx));
  const scatterMm = count < 3 ? null : Math.sqrt(residualsMm.reduce((sum, r) => sum + r * r, 0) / (count - 2));
  const uMm = Math.max(uMarkMm, scatterMm ?? 0);
  return { meanPx, meanMm, mmPerPx, uMeanMm: uMm / Math.sqrt(count), uMmPerPx: uMm / Math.sqrt(square), residualsMm, scatterMm };
}

/** Reading of the scale at a column, mm. */
export const mmAt = (scale: SpotScale, px: number): number => scale.meanMm + scale.mmPerPx * (px - scale.meanPx);

/** Standard uncertainty of that reading, mm, for a column that is known to `uPx`. */
export const uMmAt = (scale: SpotScale, px: number, uPx: number): number =>
  Math.hypot(scale.uMeanMm, (px - scale.meanPx) * scale.uMmPerPx, scale.mmPerPx * uPx);

/** The same scale as a line through column 0: mm = offset + slope · px. */
export function lineOf({ meanPx, meanMm, mmPerPx, uMeanMm, uMmPerPx }: SpotScale): Calibration {
  return {
    offset: meanMm - mmPerPx * meanPx,
    slope: mmPerPx,
    uOffset: Math.hypot(uMeanMm, meanPx * uMmPerPx),
    uSlope: uMmPerPx,
    covariance: -meanPx * uMmPerPx * uMmPerPx,
  };
}

/** What the scale leaves open of readings that are in its mm already: they stay as they are, with its u. */
export function calibrationOf({ meanMm, mmPerPx, uMeanMm, uMmPerPx }: SpotScale): Calibration {
  const uSlope = uMmPerPx / Math.abs(mmPerPx);
  return { offset: 0, slope: 1, uOffset: Math.hypot(uMeanMm, meanMm * uSlope), uSlope, covariance: -meanMm * uSlope * uSlope };
}
