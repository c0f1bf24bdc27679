/** Robust weights (Huber; Tukey's biweight), with constants that cost 5 % efficiency on normal residuals. */

const huberLimit = 1.345;
const biweightLimit = 4.685;
/** Median of |z| of a normal z is 1/1.4826. */
const normalMad = 1.482602218505602;

/** Weight of a residual in units of the scale: falls off slowly, never to nothing. */
export function huberWeight(z: number): number {
  return Math.abs(z) <= huberLimit ? 1 : huberLimit / Math.abs(z);
}

/** Weight of a residual in units of the scale: nothing from 4.685 on; needs a good start. */
export function biweight(z: number): number {
  const share = z / biweightLimit;
  return Math.abs(share) >= 1 ? 0 : (1 - share * share) ** 2;
}

/** How fast weight times residual changes with the residual: less than the weight, which is why an error of the data moves the fit more than the weights alone say. */
export const huberSlope = (z: number): number => (Math.abs(z) <= huberLimit ? 1 : 0);

export function biweightSlope(z: number): number {
  const square = (z / biweightLimit) ** 2;
  return square >= 1 ? 0 : (1 - square) * (1 - 5 * square);
}

/** Standard deviation of a normal law with the median of |residual| of these. */
export function robustScale(residuals: Float64Array): number {
  return normalMad * median(residuals.map(Math.abs));
}

export function median(values: ArrayLike<number>): number {
  const sorted = Float64Array.from(values).sort();
  const middle = sorted.length >> 1;
  return sorted.length % 2 === 1 ? (sorted[middle] as number) : ((sorted[middle - 1] as number) + (sorted[middle] as number)) / 2;
}

const mostIterations = 30;

/** Location by Huber's weights and then the biweight, the scale fixed at 1.4826 MAD, from the median. */
export function robustMean(values: readonly number[]): { huber: number; biweight: number } {
  const start = median(values);
  const scale = robustScale(Float64Array.from(values, (value) => value - start));
  const located = (weightOf: (z: number) => number, from: number): number => {
    let at = from;
    for (let iteration = 0; iteration < mostIterations && scale > 0; iteration += 1) {
      let [sum, total] = [0, 0];
      for (const value of values) {
        const weight = weightOf((value - at) / scale);
        sum += weight * value;
        total += weight;
      }
      at = sum / total;
    }
    return at;
  };
  const huber = located(huberWeight, start);
  return { huber, biweight: located(biweight, huber) };
}
