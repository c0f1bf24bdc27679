/**
 * Attraction of a uniform upright cylinder, towards its axis. By Gauss's theorem the volume integral is one over the surface, of which
 * the height is done in closed form and the azimuth by the midpoint rule, whose error for a periodic function falls geometrically. What
 * comes out, over the attraction of a point, is a smooth function of (radius/distance)², kept as a Chebyshev series.
 */

/** Shape and place of a cylinder, m: `offsetM` is the height of its centre above the point that is pulled. */
export interface Cylinder {
  radiusM: number;
  heightM: number;
  offsetM: number;
}

/** Attraction per distance of a body of unit mass with G = 1, 1/m3, and its derivative by the squared horizontal distance, 1/m5. */
export interface Pull {
  value: number;
  slope: number;
}

const nodes = 64;
/** The series holds down to distances of 1.02 radii. */
const seriesEnd = 0.96;
const smallestTerm = 1e-15;
const mostAzimuths = 4096;
const keptSeries = 64;

/** Attraction over that of a point mass in the same centre, at the horizontal distance ρ (m). */
function ratioToPoint({ radiusM: a, heightM: l, offsetM: h }: Cylinder, rho: number): number {
  const decay = Math.abs(Math.log(Math.min(a / rho, rho / a)));
  const azimuths = Math.min(mostAzimuths, Math.max(16, Math.ceil(-Math.log(smallestTerm) / Math.max(decay, 1e-3))));
  let sum = 0;
  for (let k = 0; k < azimuths; k += 1) {
    const t = (Math.PI * (k + 0.5)) / azimuths;
    const s = Math.sqrt(a * a + rho * rho - 2 * a * rho * Math.cos(t));
    sum += Math.cos(t) * (Math.asinh((h + l / 2) / s) - Math.asinh((h - l / 2) / s));
  }
  const pull = (2 * sum) / (azimuths * a * l);
  return (pull * (rho * rho + h * h) ** 1.5) / rho;
}

/** Coefficients of the series in x = 2w/seriesEnd − 1, w = (radius/distance)². */
function seriesOf(cylinder: Cylinder): Float64Array {
  const values = Array.from({ length: nodes }, (_, k) => {
    const w = (seriesEnd / 2) * (1 + Math.cos((Math.PI * (k + 0.5)) / nodes));
    return ratioToPoint(cylinder, cylinder.radiusM / Math.sqrt(w));
  });
  return Float64Array.from({ length: nodes }, (_, j) => {
    const sum = values.reduce((total, value, k) => total + value * Math.cos((Math.PI * j * (k + 0.5)) / nodes), 0);
    return (sum * (j === 0 ? 1 : 2)) / nodes;
  });
}

/** Terms beyond the last that counts cost time and add nothing. */
function shortened(series: Float64Array): Float64Array {
  let length = series.length;
  while (length > 2 && Math.abs(series[length - 1] as number) < smallestTerm) length -= 1;
  return series.slice(0, length);
}

const known = new Map<string, Float64Array>();

function seriesFor(cylinder: Cylinder): Float64Array {
  const key = `${cylinder.radiusM} ${cylinder.heightM} ${cylinder.offsetM}`;
  const kept = known.get(key);
  if (kept !== undefined) return kept;
  const series = shortened(seriesOf(cylinder));
  const [oldest] = known.keys();
  if (known.size >= keptSeries && oldest !== undefined) known.delete(oldest);
  known.set(key, series);
  return series;
}

/** Sum of a Chebyshev series and its derivative at x (Clenshaw's rule for both). */
function evaluate(series: Float64Array, x: number): Pull {
  let [b1, b2, d1, d2] = [0, 0, 0, 0];
  for (let j = series.length - 1; j >= 1; j -= 1) {
    const d = 2 * b1 + 2 * x * d1 - d2;
    const b = (series[j] as number) + 2 * x * b1 - b2;
    [d2, d1, b2, b1] = [d1, d, b1, b];
  }
  return { value: (series[0] as number) + x * b1 - b2, slope: b1 + x * d1 - d2 };
}

/** The pull of a cylinder as a function of the squared horizontal distance from its axis, m2. */
export function cylinderPull(cylinder: Cylinder): (squareM2: number) => Pull {
  const series = seriesFor(cylinder);
  const radiusSquare = cylinder.radiusM ** 2;
  const offsetSquare = cylinder.offsetM ** 2;
  const direct = (square: number) => ratioToPoint(cylinder, Math.sqrt(square)) / (square + offsetSquare) ** 1.5;
  return (square) => {
    const w = radiusSquare / square;
    if (!(w <= seriesEnd)) {
      const step = 1e-5 * square;
      return { value: direct(square), slope: (direct(square + step) - direct(square - step)) / (2 * step) };
    }
    const { value: ratio, slope } = evaluate(series, (2 * w) / seriesEnd - 1);
    const point = (square + offsetSquare) ** -1.5;
    return {
      value: ratio * point,
      slope: ((-2 * slope * w) / (seriesEnd * square)) * point - (1.5 * ratio * point) / (square + offsetSquare),
    };
  };
}
