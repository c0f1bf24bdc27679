/** Curves for SVG: least and greatest in each pixel column, and a gap where data are missing. Pure. */

export interface Series {
  /** Ascending, UTC ms (or any abscissa). */
  x: ArrayLike<number>;
  y: ArrayLike<number>;
}

export interface CurveScale {
  xToPx: (x: number) => number;
  yToPx: (y: number) => number;
}

export interface CurveOptions extends CurveScale {
  /** A longer step in x ends the line and begins a new one; absent: 8 times the median step. */
  gap?: number | undefined;
  fromX: number;
  toX: number;
}

/** First index whose value is ≥ x, in an ascending array. */
export function lowerBound(values: ArrayLike<number>, x: number): number {
  let low = 0;
  let high = values.length;
  while (low < high) {
    const middle = (low + high) >>> 1;
    if ((values[middle] as number) < x) low = middle + 1;
    else high = middle;
  }
  return low;
}

/** A step in x that is longer than this is missing data: 8 times the median step, which bears thinned and jittery series. */
export function gapOf(x: ArrayLike<number>): number {
  if (x.length < 3) return Infinity;
  const stride = Math.max(1, Math.floor(x.length / 400));
  const steps: number[] = [];
  for (let i = 1; i < x.length; i += stride) steps.push((x[i] as number) - (x[i - 1] as number));
  steps.sort((a, b) => a - b);
  const median = steps[steps.length >> 1] as number;
  return median > 0 ? 8 * median : Infinity;
}

const round = (px: number) => Math.round(px * 10) / 10;

interface Column {
  px: number;
  first: number;
  last: number;
  min: number;
  max: number;
  minFirst: boolean;
}

function columnPoints(column: Column): [number, number][] {
  const { px, first, last, min, max, minFirst } = column;
  const middle: number[] = minFirst ? [min, max] : [max, min];
  const kept = [first, ...middle, last].filter((y, index, all) => index === 0 || y !== all[index - 1]);
  return kept.map((y) => [px, y]);
}

/** The lines of a series within a window, in pixels: one list of points for each stretch without a gap. */
export function curveSegments(series: Series, options: CurveOptions): [number, number][][] {
  const { fromX, toX, xToPx, yToPx } = options;
  const gap = options.gap ?? gapOf(series.x);
  const start = Math.max(0, lowerBound(series.x, fromX) - 1);
  const segments: [number, number][][] = [];
  let points: [number, number][] = [];
  let column: Column | null = null;
  let previousX = NaN;
  const close = () => {
    if (column) points.push(...columnPoints(column));
    column = null;
    if (points.length > 0) segments.push(points);
    points = [];
  };
  for (let i = start; i < series.x.length; i += 1) {
    const x = series.x[i] as number;
    const y = series.y[i] as number;
    if (x - previousX > gap) close();
    previousX = x;
    if (!Number.isFinite(y)) {
      close();
      continue;
    }
    const px = Math.round(xToPx(x) * 2) / 2;
    const py = yToPx(y);
    if (column !== null && (column as Column).px === px) extend(column, py);
    else {
      if (column) points.push(...columnPoints(column));
      column = { px, first: py, last: py, min: py, max: py, minFirst: true };
    }
    if (x > toX) break;
  }
  close();
  return segments;
}

function extend(column: Column, py: number): void {
  if (py < column.min) {
    column.min = py;
    column.minFirst = false;
  }
  if (py > column.max) {
    column.max = py;
    column.minFirst = true;
  }
  column.last = py;
}

/** The `d` of an SVG path; a lone point becomes a dot of 1.5 px so that it can be seen. */
export function pathOf(segments: readonly (readonly [number, number])[][]): string {
  return segments
    .map((points) => {
      const [first, ...rest] = points;
      if (!first) return '';
      const start = `M${round(first[0])} ${round(first[1])}`;
      return rest.length === 0 ? `${start}h1.5` : start + rest.map(([px, py]) => `L${round(px)} ${round(py)}`).join('');
    })
    .join('');
}

/** Value at x by straight interpolation, or null outside the series and in its gaps. */
export function valueAt(series: Series, x: number, gap = gapOf(series.x)): number | null {
  const after = lowerBound(series.x, x);
  if (series.x[after] === x) return series.y[after] as number;
  if (after === 0 || after >= series.x.length) return null;
  const x0 = series.x[after - 1] as number;
  const x1 = series.x[after] as number;
  if (x1 - x0 > gap) return null;
  const y0 = series.y[after - 1] as number;
  const y1 = series.y[after] as number;
  return y0 + ((y1 - y0) * (x - x0)) / (x1 - x0);
}

/** Least and greatest of a series within a window, or null when nothing lies in it. */
export function extent(series: Series, fromX: number, toX: number): [number, number] | null {
  let least = Infinity;
  let greatest = -Infinity;
  for (let i = lowerBound(series.x, fromX); i < series.x.length && (series.x[i] as number) <= toX; i += 1) {
    const y = series.y[i] as number;
    if (!Number.isFinite(y)) continue;
    if (y < least) least = y;
    if (y > greatest) greatest = y;
  }
  return least <= greatest ? [least, greatest] : null;
}
