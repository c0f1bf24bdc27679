import { formatFixed, formatSignificant } from '@/shared/lib/format-number';
import { logTicks, niceTicks } from '@/shared/lib/ticks';

/** Plots of the report: points with ± u, lines and a band in one frame, black on white. Lengths in points. */

export interface PlotPoint {
  x: number;
  y: number;
  /** 0 or absent: no bar. */
  u?: number;
  mark: 'disc' | 'ring' | 'dot';
}

export interface Plot {
  points: readonly PlotPoint[];
  lines?: readonly { points: readonly { x: number; y: number }[]; dashed?: boolean }[];
  /** A value with its standard uncertainty over the whole width. */
  band?: { y: number; u: number };
  /** Both axes logarithmic; all values must be positive. */
  logarithmic?: boolean;
  /** Values of x are numbers of something: only whole ones are marked. */
  whole?: boolean;
  xWords: string;
  yWords: string;
}

const leftPt = 54;
const abovePt = 16;
const belowPt = 30;
const radius = { disc: 2.2, ring: 2.2, dot: 0.7 } as const;

/** Room that a plot takes with its words. */
export const plotRoomPt = (heightPt: number) => abovePt + heightPt + belowPt;

interface Axis {
  from: number;
  to: number;
  ticks: { at: number; words: string }[];
}

/** Draws a plot of that height at (x, y), words included. */
export function drawPlot(document: PDFKit.PDFDocument, place: { x: number; y: number; width: number; heightPt: number }, plot: Plot): void {
  const [left, top] = [place.x + leftPt, place.y + abovePt];
  const width = place.width - leftPt - 6;
  const { x, y } = axesOf(plot);
  const along = plot.logarithmic === true ? Math.log10 : (value: number) => value;
  const px = (value: number) => left + ((along(value) - x.from) / (x.to - x.from)) * width;
  const py = (value: number) => top + place.heightPt - ((along(value) - y.from) / (y.to - y.from)) * place.heightPt;
  document.save();
  document.rect(left, top, width, place.heightPt).clip();
  drawBand(document, plot, { left, width, py });
  for (const line of plot.lines ?? []) drawLine(document, line, { px, py });
  for (const point of plot.points) drawPoint(document, point, { px, py });
  document.restore();
  document.lineWidth(0.5).strokeColor('#555555').rect(left, top, width, place.heightPt).stroke();
  document.fillColor('#000000').font('plain').fontSize(7.5);
  for (const { at, words } of y.ticks) {
    const height = top + place.heightPt - ((at - y.from) / (y.to - y.from)) * place.heightPt;
    tick(document, [left - 3, height, left, height]);
    document.text(words, place.x, height - 4, { width: leftPt - 6, align: 'right', lineBreak: false });
  }
  for (const { at, words } of x.ticks) {
    const across = left + ((at - x.from) / (x.to - x.from)) * width;
    tick(document, [across, top + place.heightPt, across, top + place.heightPt + 3]);
    document.text(words, across - 25, top + place.heightPt + 5, { width: 50, align: 'center', lineBreak: false });
  }
  document.text(plot.yWords, place.x, place.y + 2, { width: place.width, lineBreak: false });
  document.text(plot.xWords, left, top + place.heightPt + 16, { width, align: 'right', lineBreak: false });
}

function tick(document: PDFKit.PDFDocument, [fromX, fromY, toX, toY]: [number, number, number, number]): void {
  document.lineWidth(0.5).strokeColor('#555555').moveTo(fromX, fromY).lineTo(toX, toY).stroke();
}

type Projection = { px: (x: number) => number; py: (y: number) => number };

function drawBand(
  document: PDFKit.PDFDocument,
  { band }: Plot,
  { left, width, py }: { left: number; width: number; py: Projection['py'] },
): void {
  if (band === undefined) return;
  const [high, low] = [py(band.y + band.u), py(band.y - band.u)];
  document.rect(left, high, width, low - high).fill('#dddddd');
  document
    .lineWidth(0.7)
    .strokeColor('#000000')
    .moveTo(left, py(band.y))
    .lineTo(left + width, py(band.y))
    .stroke();
}

function drawLine(
  document: PDFKit.PDFDocument,
  { points, dashed }: { points: readonly { x: number; y: number }[]; dashed?: boolean },
  { px, py }: Projection,
): void {
  const [first, ...rest] = points;
  if (first === undefined) return;
  document.lineWidth(0.8).strokeColor('#000000').moveTo(px(first.x), py(first.y));
  for (const { x, y } of rest) document.lineTo(px(x), py(y));
  if (dashed === true) document.dash(3, { space: 2 });
  document.stroke().undash();
}

function drawPoint(document: PDFKit.PDFDocument, { x, y, u = 0, mark }: PlotPoint, { px, py }: Projection): void {
  document.lineWidth(0.5).strokeColor('#000000');
  if (u > 0)
    document
      .moveTo(px(x), py(y - u))
      .lineTo(px(x), py(y + u))
      .stroke();
  document.circle(px(x), py(y), radius[mark]);
  if (mark === 'ring') document.fillAndStroke('#ffffff', '#000000');
  else document.fill('#000000');
}

function axesOf({ points, lines = [], band, logarithmic, whole }: Plot): { x: Axis; y: Axis } {
  const all = [...points, ...lines.flatMap((line) => line.points)];
  const ys = [...all.map(({ y }) => y), ...points.flatMap(({ y, u = 0 }) => [y - u, y + u])];
  if (band !== undefined) ys.push(band.y - band.u, band.y + band.u);
  const xs = all.map(({ x }) => x);
  if (logarithmic === true) return { x: logAxis(xs), y: logAxis(ys.filter((y) => y > 0)) };
  return { x: axisOf(xs, { count: 8, whole: whole === true }), y: axisOf(ys, { count: 5, whole: false }) };
}

function axisOf(values: readonly number[], { count, whole }: { count: number; whole: boolean }): Axis {
  const [low, high] = [Math.min(...values), Math.max(...values)];
  const room = high > low ? 0.05 * (high - low) : Math.abs(high) || 1;
  const [from, to] = [low - room, high + room];
  const { values: at, decimals } = niceTicks(from, to, count);
  return {
    from,
    to,
    ticks: at.filter((one) => !whole || Number.isInteger(one)).map((one) => ({ at: one, words: formatFixed(one, { decimals }) })),
  };
}

function logAxis(values: readonly number[]): Axis {
  const logs = values.map(Math.log10);
  const [from, to] = [Math.min(...logs) - 0.1, Math.max(...logs) + 0.1];
  return { from, to, ticks: logTicks(from, to).map((at) => ({ at, words: formatSignificant(10 ** at, 1) })) };
}
