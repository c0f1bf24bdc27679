import * as z from 'zod';
import { instantSchema } from './common';

/** What the passes of the home edge say of a counted position. All angles in degrees at the table, u standard uncertainties (k = 1). */
export const positionViewSchema = z.strictObject({
  /** When the count was proved last, at the edge or by homing; null: not in this run. */
  provedAt: instantSchema.nullable(),
  uProvedS: z.number().nullable(),
  direction: z.enum(['ccw', 'cw']).nullable(),
  /** Count at that pass less the angle of the edge. */
  offsetDeg: z.number().nullable(),
  /** Change since homing, at the last pass; where the table slipped, the slip. */
  slipDeg: z.number().nullable(),
  slipSteps: z.number().int().nullable(),
  /** Of the slip and of the backlash: two readings of the edge each. */
  uDeg: z.number(),
  /** Difference between the directions; null until the edge was met in both since homing. */
  backlashDeg: z.number().nullable(),
  toleranceDeg: z.number(),
  /** Dwells since the last good pass. */
  dwellsSince: z.number().int(),
  /** When a pass was outside the tolerance; null while none was since homing. */
  slippedAt: instantSchema.nullable(),
});
export type PositionView = z.infer<typeof positionViewSchema>;
