import * as z from 'zod';
import type { Region } from './intensities';
import { FEWEST_COLUMNS, FEWEST_ROWS } from './read-spot';

/** How the reader of a rig is set: kept on the device, because the camera belongs to it. */

const wholePx = z.number().int().nonnegative();

export const spotSettingSchema = z.strictObject({
  cameraId: z.string().nullable(),
  cameraName: z.string().nullable().default(null),
  /** The pictures that region and marks belong to: of one camera, in one size, px. */
  picture: z.strictObject({ cameraId: z.string(), width: wholePx, height: wholePx }).nullable(),
  region: z.strictObject({ left: wholePx, top: wholePx, width: wholePx, height: wholePx }).nullable(),
  of: z.enum(['centre', 'left', 'right']),
  light: z.enum(['all', 'red', 'green', 'blue']),
  marks: z.array(z.strictObject({ px: z.number(), mm: z.number() })).max(40),
  /** Standard uncertainty of a mark, mm. */
  uMarkMm: z.number().positive(),
  channel: z.string(),
  /** Token of a device that may fill the channel. */
  token: z.string(),
  /** Whether it was reading: a page that is loaded anew goes on. */
  reading: z.boolean().default(false),
});
export type MarkedPicture = NonNullable<z.infer<typeof spotSettingSchema>['picture']>;
export type SpotSetting = z.infer<typeof spotSettingSchema>;

export const freshSetting: SpotSetting = {
  cameraId: null,
  cameraName: null,
  picture: null,
  region: null,
  of: 'centre',
  light: 'all',
  marks: [],
  uMarkMm: 0.2,
  channel: '',
  token: '',
  reading: false,
};

/** Whether a text can be the token of a device. */
export const isToken = (text: string): boolean => /^\S{20,200}$/.test(text.trim());

/** Whether two pictures are of one camera and size, so that a column means the same place. */
export const isSamePicture = (a: MarkedPicture, b: MarkedPicture): boolean =>
  a.cameraId === b.cameraId && a.width === b.width && a.height === b.height;

/** The middle third of a picture, all its width: where a scale lies that somebody has just aimed at. */
export const usualRegion = ({ width, height }: { width: number; height: number }): Region => ({
  left: 0,
  top: Math.floor(height / 3),
  width,
  height: Math.max(1, Math.floor(height / 3)),
});

/** Why a region cannot be read in a picture of this size; null where it can. */
export function regionFault({ left, top, width, height }: Region, picture: { width: number; height: number }): string | null {
  if (width < FEWEST_COLUMNS || height < FEWEST_ROWS)
    return `The region is ${width} × ${height} px; at least ${FEWEST_COLUMNS} × ${FEWEST_ROWS} px are needed.`;
  if (left + width > picture.width || top + height > picture.height)
    return `The region ends at column ${left + width} and row ${top + height}, but the picture has ${picture.width} × ${picture.height} px.`;
  return null;
}

/** The region between two corners in any order, within the picture, whole px. */
export function regionBetween(
  a: { x: number; y: number },
  b: { x: number; y: number },
  picture: { width: number; height: number },
): Region {
  const within = (value: number, most: number) => Math.min(most, Math.max(0, Math.round(value)));
  const left = within(Math.min(a.x, b.x), picture.width);
  const top = within(Math.min(a.y, b.y), picture.height);
  return { left, top, width: within(Math.max(a.x, b.x), picture.width) - left, height: within(Math.max(a.y, b.y), picture.height) - top };
}
