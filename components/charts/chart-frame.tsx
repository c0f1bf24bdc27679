import type { ReactNode } from 'react';
import { G, Line, Text as SvgText } from 'react-native-svg';
import type { ThemeColors } from '@/components/theme';
import { formatFixed } from '@/shared/lib/format-number';
import { niceTicks } from '@/shared/lib/ticks';

const numberFont = 'Atkinson Hyperlegible Mono';
const wordFont = 'Atkinson Hyperlegible Next';

export interface FrameBox {
  left: number;
  top: number;
  width: number;
  height: number;
}

export interface FrameScale {
  x: [number, number];
  y: [number, number];
}

export interface Mapped {
  toX: (x: number) => number;
  toY: (y: number) => number;
}

/** From data to pixels within a box; y grows upwards. */
export function mapInto(box: FrameBox, scale: FrameScale): Mapped {
  return {
    toX: (x) => box.left + ((x - scale.x[0]) / (scale.x[1] - scale.x[0] || 1)) * box.width,
    toY: (y) => box.top + box.height - ((y - scale.y[0]) / (scale.y[1] - scale.y[0] || 1)) * box.height,
  };
}

/** The span of values with room around it; a single value gets room too. */
export function roomy(values: readonly number[], share = 0.08): [number, number] {
  const finite = values.filter(Number.isFinite);
  if (finite.length === 0) return [0, 1];
  const least = Math.min(...finite);
  const greatest = Math.max(...finite);
  const span = greatest - least;
  // Values that differ in their last digits only are one value.
  const room = span > Math.abs(greatest) * 1e-9 ? span * share : Math.abs(greatest) * 0.01 || 1;
  return [least - room, greatest + room];
}

interface AxesProps {
  box: FrameBox;
  scale: FrameScale;
  colors: ThemeColors;
  xUnit?: string;
  yUnit?: string;
  xTicks?: number;
  yTicks?: number;
  /** Ticks of x stand under this box; false for all but the lowest of boxes that share x. */
  showX?: boolean;
  formatX?: (x: number) => string;
  formatY?: (y: number) => string;
  /** Where the ticks stand, instead of at round values. */
  at?: { x: readonly number[]; y: readonly number[] };
  children?: ReactNode;
}

/** Round ticks, hairlines, and the units once at the axes' ends. */
export function Axes({
  box,
  scale,
  colors,
  xUnit = '',
  yUnit = '',
  xTicks = 4,
  yTicks = 4,
  showX = true,
  formatX,
  formatY,
  at,
}: AxesProps) {
  const { toX, toY } = mapInto(box, scale);
  const xs = niceTicks(scale.x[0], scale.x[1], xTicks);
  const ys = niceTicks(scale.y[0], scale.y[1], yTicks);
  const bottom = box.top + box.height;
  return (
    <G>
      {(at?.y ?? ys.values).map((y) => (
        <G key={y}>
          <Line x1={box.left} x2={box.left + box.width} y1={toY(y)} y2={toY(y)} stroke={colors.line} strokeWidth={1} />
          <SvgText x={box.left - 6} y={toY(y) + 4.5} textAnchor="end" fontSize={13} fontFamily={numberFont} fill={colors.dim}>
            {formatY ? formatY(y) : formatFixed(y, { decimals: ys.decimals })}
          </SvgText>
        </G>
      ))}
      <Line x1={box.left} x2={box.left + box.width} y1={bottom} y2={bottom} stroke={colors.faint} strokeWidth={1} />
      {showX
        ? (at?.x ?? xs.values).map((x) => (
            <G key={x}>
              <Line x1={toX(x)} x2={toX(x)} y1={bottom} y2={bottom + 4} stroke={colors.faint} strokeWidth={1} />
              <SvgText x={toX(x)} y={bottom + 18} textAnchor="middle" fontSize={13} fontFamily={numberFont} fill={colors.dim}>
                {formatX ? formatX(x) : formatFixed(x, { decimals: xs.decimals })}
              </SvgText>
            </G>
          ))
        : null}
      {yUnit === '' ? null : (
        <SvgText x={box.left} y={box.top - 7} textAnchor="start" fontSize={13} fontFamily={wordFont} fill={colors.dim}>
          {yUnit}
        </SvgText>
      )}
      {xUnit === '' ? null : (
        <SvgText x={box.left + box.width} y={bottom + 34} textAnchor="end" fontSize={13} fontFamily={wordFont} fill={colors.dim}>
          {xUnit}
        </SvgText>
      )}
    </G>
  );
}
