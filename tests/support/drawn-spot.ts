import type { Intensities } from '@/shared/spot/intensities';
import { normalDeviates } from './lcg';

/** Pictures of a light spot whose place is known, as a camera with known noise would take them. */

export interface DrawnSpot {
  width: number;
  height: number;
  x: number;
  y: number;
  /** Standard deviations of the Gaussian spot, px. */
  sigmaX: number;
  sigmaY: number;
  /** Height above the background, of 255. */
  height255: number;
  background: { level: number; perColumn: number; perRow: number };
  /** Standard deviation of the read noise, and variance a grey level of the shot noise. */
  noise: { read: number; shot: number };
}

export const usualSpot: DrawnSpot = {
  width: 160,
  height: 40,
  x: 80,
  y: 20,
  sigmaX: 5,
  sigmaY: 6,
  height255: 150,
  background: { level: 12, perColumn: 0.05, perRow: -0.08 },
  noise: { read: 2, shot: 0.15 },
};

/** A picture of 8 bits: noise, then rounded and cut at both ends. */
export function drawSpot(spot: DrawnSpot, deviate: () => number): Intensities {
  const { width, height, background, noise } = spot;
  const values = new Float64Array(width * height);
  let saturated = 0;
  let brightest = 0;
  for (let y = 0; y < height; y += 1)
    for (let x = 0; x < width; x += 1) {
      const exponent = ((x - spot.x) / spot.sigmaX) ** 2 + ((y - spot.y) / spot.sigmaY) ** 2;
      const light = background.level + background.perColumn * x + background.perRow * y + spot.height255 * Math.exp(-exponent / 2);
      const sigma = Math.sqrt(noise.read ** 2 + noise.shot * light);
      const value = Math.min(255, Math.max(0, Math.round(light + (sigma === 0 ? 0 : sigma * deviate()))));
      if (value >= 253) saturated += 1;
      if (value > brightest) brightest = value;
      values[y * width + x] = value;
    }
  return { width, height, values, saturated, brightest };
}

export const seeded = (seed: number) => normalDeviates(seed);
