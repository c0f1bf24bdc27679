import { readDecimal } from '@/components/ui/read-decimal';
import { fitScale, lineOf, type SpotScale } from '@/shared/spot/scale';
import type { Calibration } from '@/shared/statistics/calibration';

/** A calibration as it is being written down: by comparison with a standard, or by the figures of a certificate. Pure. */

export interface CalibrationDraft {
  by: 'comparison' | 'figures';
  /** What the channel read, and what the standard said. */
  points: { reading: string; standard: string }[];
  /** Standard uncertainty of what the standard said. */
  uStandard: string;
  offset: string;
  slope: string;
  uOffset: string;
  uSlope: string;
  covariance: string;
  note: string;
}

const noPoint = { reading: '', standard: '' };
export const freshCalibration: CalibrationDraft = {
  ...{ by: 'comparison', points: [noPoint, noPoint], uStandard: '' },
  ...{ offset: '0', slope: '1', uOffset: '', uSlope: '', covariance: '0', note: '' },
};
export const withPoint = (draft: CalibrationDraft): CalibrationDraft => ({ ...draft, points: [...draft.points, noPoint] });

/** The line through the points; null while they make none. */
export function fitOf({ points, uStandard }: CalibrationDraft): SpotScale | null {
  const read = points.map(({ reading, standard }) => ({ px: readDecimal(reading), mm: readDecimal(standard) }));
  const u = readDecimal(uStandard);
  const marks = read.flatMap(({ px, mm }) => (px === null || mm === null ? [] : [{ px, mm }]));
  return marks.length < points.length || u === null || u < 0 ? null : fitScale(marks, u);
}

/** Null while something is missing. */
export function calibrationOfDraft(draft: CalibrationDraft): Calibration | null {
  if (draft.by === 'comparison') {
    const fit = fitOf(draft);
    return fit === null ? null : lineOf(fit);
  }
  const figures = [draft.offset, draft.slope, draft.uOffset, draft.uSlope, draft.covariance].map(readDecimal);
  const [offset, slope, uOffset, uSlope, covariance] = figures;
  if (offset == null || slope == null || uOffset == null || uSlope == null || covariance == null) return null;
  return uOffset < 0 || uSlope < 0 ? null : { offset, slope, uOffset, uSlope, covariance };
}
