import { View } from 'react-native';
import Svg, { Line, Path, Rect } from 'react-native-svg';
import { useTheme } from '@/components/theme';
import { curveSegments, extent, pathOf } from './curve';
import type { TimePlotProps } from './time-plot-types';
import { useWidth } from './use-width';

const bandPx = 8;

/** The plain picture, for places without a canvas: line, stands, exclusions, marked stretch and cursor, moved by the buttons alone. */
export function TimePlot({ utcMs, value, title, view, gapMs, bands, excluded, marked, heightPx = 260, testID }: TimePlotProps) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth();
  const series = { x: utcMs, y: value };
  const { from: fromX, to: toX } = view.span;
  const [low, high] = extent(series, fromX, toX) ?? [0, 1];
  const xToPx = (x: number) => ((x - fromX) / (toX - fromX || 1)) * width;
  const yToPx = (y: number) => heightPx - ((y - low) / (high - low || 1)) * heightPx;
  const stretches = [...(excluded ?? []).map((span) => ({ ...span, opacity: 0.2 })), ...(marked ? [{ ...marked, opacity: 0.35 }] : [])];
  return (
    <View onLayout={onLayout} role="img" aria-label={title} style={{ height: heightPx }} testID={testID}>
      <Svg width={width} height={heightPx}>
        {(bands ?? []).map(({ lane, fromUtcMs, toUtcMs }) =>
          lane === 'other' || toUtcMs < fromX || fromUtcMs > toX ? null : (
            <Rect
              key={fromUtcMs}
              x={xToPx(fromUtcMs)}
              y={lane === 'near' ? 0 : heightPx - bandPx}
              width={Math.max(1, xToPx(toUtcMs) - xToPx(fromUtcMs))}
              height={bandPx}
              fill={lane === 'near' ? colors.near : colors.far}
            />
          ),
        )}
        {stretches.map(({ from, to, opacity }) => (
          <Rect
            key={`${from} ${to}`}
            x={xToPx(from)}
            y={0}
            width={Math.max(1, xToPx(to) - xToPx(from))}
            height={heightPx}
            fill={colors.lamp}
            opacity={opacity}
          />
        ))}
        <Path
          d={pathOf(curveSegments(series, { xToPx, yToPx, fromX, toX, gap: gapMs }))}
          stroke={colors.text}
          strokeWidth={1.5}
          fill="none"
        />
        {view.cursor === null ? null : <Line x1={xToPx(view.cursor)} x2={xToPx(view.cursor)} y1={0} y2={heightPx} stroke={colors.lamp} />}
      </Svg>
    </View>
  );
}
