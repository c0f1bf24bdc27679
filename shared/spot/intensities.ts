/** A region of a camera's picture, px: `left` and `top` belong to it, `left + width` does not. */
export interface Region {
  left: number;
  top: number;
  width: number;
  height: number;
}

/** What of the picture's colours is taken for the light of the spot. */
export type Light = 'all' | 'red' | 'green' | 'blue';

/** Intensities of a region, row by row, 0 to 255. */
export interface Intensities {
  width: number;
  height: number;
  values: Float64Array;
  /** Pixels whose light is at the end of the camera's range. */
  saturated: number;
  /** The greatest intensity. */
  brightest: number;
}

/** From here on a pixel of 8 bits counts as full: pictures come through a conversion that rounds (common practice, no source). */
const FULL = 253;

/** Intensities of RGBA pixels, row by row, as a canvas gives them. */
export function intensitiesOf(rgba: ArrayLike<number>, size: { width: number; height: number }, light: Light): Intensities {
  const values = new Float64Array(size.width * size.height);
  let saturated = 0;
  let brightest = 0;
  for (let i = 0; i < values.length; i += 1) {
    const red = rgba[4 * i] as number;
    const green = rgba[4 * i + 1] as number;
    const blue = rgba[4 * i + 2] as number;
    const value = light === 'all' ? (red + green + blue) / 3 : light === 'red' ? red : light === 'green' ? green : blue;
    const most = light === 'all' ? Math.max(red, green, blue) : value;
    if (most >= FULL) saturated += 1;
    if (value > brightest) brightest = value;
    values[i] = value;
  }
  return { ...size, values, saturated, brightest };
}
