import UPlot from 'uplot';
import type { ThemeColors } from '@/components/theme';
import type { StepBand, TimeSpan } from './time-plot-types';

/** What is drawn under and over the line of a canvas plot: bands of the stands, exclusions, the stretch that is being marked. */

/** Height of a lane, px; narrower in a small plot, and then without marks. */
const bandPx = { full: 10, small: 5 };
const smallBelowPx = 170;

/** Within the plot's own area, and put back as it was. */
function inside(plot: UPlot, draw: (ctx: CanvasRenderingContext2D) => void): void {
  const { ctx, bbox } = plot;
  ctx.save();
  ctx.beginPath();
  ctx.rect(bbox.left, bbox.top, bbox.width, bbox.height);
  ctx.clip();
  draw(ctx);
  ctx.restore();
}

/** Near above, far below, along the plot's edges, as in the swing strip. */
export function drawBands(plot: UPlot, bands: readonly StepBand[], colors: ThemeColors): void {
  const { bbox } = plot;
  const ratio = UPlot.pxRatio;
  const full = bbox.height >= smallBelowPx * ratio;
  const lanePx = (full ? bandPx.full : bandPx.small) * ratio;
  inside(plot, (ctx) => {
    for (const band of bands) {
      if (band.lane === 'other') continue;
      const x1 = plot.valToPos(band.fromUtcMs, 'x', true);
      const x2 = plot.valToPos(band.toUtcMs, 'x', true);
      if (x2 < bbox.left || x1 > bbox.left + bbox.width) continue;
      const near = band.lane === 'near';
      ctx.fillStyle = near ? colors.near : colors.far;
      ctx.globalAlpha = 0.07;
      ctx.fillRect(x1, bbox.top, x2 - x1, bbox.height);
      ctx.globalAlpha = band.good === false ? 0.3 : 1;
      ctx.fillRect(x1, near ? bbox.top : bbox.top + bbox.height - lanePx, Math.max(1, x2 - x1 - ratio), lanePx);
      ctx.globalAlpha = 1;
      if (full && x2 - x1 > 16 * ratio)
        drawMark(ctx, {
          x: (x1 + x2) / 2,
          y: near ? bbox.top + lanePx / 2 : bbox.top + bbox.height - lanePx / 2,
          half: 3.5 * ratio,
          up: near,
          color: colors.ink,
        });
    }
  });
}

function drawMark(
  ctx: CanvasRenderingContext2D,
  { x, y, half, up, color }: { x: number; y: number; half: number; up: boolean; color: string },
) {
  const tip = up ? -half * 0.8 : half * 0.8;
  ctx.fillStyle = color;
  ctx.beginPath();
  ctx.moveTo(x - half, y - tip);
  ctx.lineTo(x + half, y - tip);
  ctx.lineTo(x, y + tip);
  ctx.fill();
}

/** From left to right in canvas pixels, at least one wide; null outside of what is shown. */
function reachOf(plot: UPlot, { from, to }: TimeSpan): { x1: number; x2: number } | null {
  const { left, width } = plot.bbox;
  const x1 = Math.max(left, plot.valToPos(from, 'x', true));
  const x2 = Math.min(left + width, Math.max(x1 + UPlot.pxRatio, plot.valToPos(to, 'x', true)));
  return x2 <= x1 ? null : { x1, x2 };
}

/** Hatched over the whole height, so that it is told from a stand without its colour. */
export function drawExcluded(plot: UPlot, excluded: readonly TimeSpan[], colors: ThemeColors): void {
  const { ctx, bbox } = plot;
  const stepPx = 9 * UPlot.pxRatio;
  for (const span of excluded) {
    const reach = reachOf(plot, span);
    if (reach === null) continue;
    const { x1, x2 } = reach;
    ctx.save();
    ctx.beginPath();
    ctx.rect(x1, bbox.top, x2 - x1, bbox.height);
    ctx.clip();
    ctx.strokeStyle = colors.lamp;
    ctx.globalAlpha = 0.55;
    ctx.lineWidth = UPlot.pxRatio;
    ctx.strokeRect(x1, bbox.top, x2 - x1, bbox.height);
    ctx.beginPath();
    for (let x = x1 - bbox.height; x < x2; x += stepPx) {
      ctx.moveTo(x, bbox.top + bbox.height);
      ctx.lineTo(x + bbox.height, bbox.top);
    }
    ctx.stroke();
    ctx.restore();
  }
}

/** Over the line: a veil between two strong edges, which are told from hatching by their look. */
export function drawMarked(plot: UPlot, marked: TimeSpan | null, colors: ThemeColors): void {
  if (marked === null) return;
  const { bbox } = plot;
  inside(plot, (ctx) => {
    const [x1, x2] = [plot.valToPos(marked.from, 'x', true), plot.valToPos(marked.to, 'x', true)];
    const edge = 2 * UPlot.pxRatio;
    ctx.fillStyle = colors.lamp;
    ctx.globalAlpha = 0.25;
    ctx.fillRect(x1, bbox.top, x2 - x1, bbox.height);
    ctx.globalAlpha = 1;
    for (const x of [x1, x2]) ctx.fillRect(x - edge / 2, bbox.top, edge, bbox.height);
  });
}
