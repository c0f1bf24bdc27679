import { View } from 'react-native';
import Svg, { Path } from 'react-native-svg';
import { useTheme } from '@/components/theme';
import { curveSegments, extent, pathOf } from './curve';
import type { DeflectionPlotProps } from './deflection-plot-types';
import { useWidth } from './use-width';

/** The plain picture, for places without a canvas: the whole series in one line. */
export function DeflectionPlot({ utcMs, value, title, heightPx = 260 }: DeflectionPlotProps) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth();
  const series = { x: utcMs, y: value };
  const fromX = utcMs[0] ?? 0;
  const toX = utcMs[utcMs.length - 1] ?? 1;
  const [low, high] = extent(series, fromX, toX) ?? [0, 1];
  const xToPx = (x: number) => ((x - fromX) / (toX - fromX || 1)) * width;
  const yToPx = (y: number) => heightPx - ((y - low) / (high - low || 1)) * heightPx;
  return (
    <View onLayout={onLayout} role="img" aria-label={title} style={{ height: heightPx }}>
      <Svg width={width} height={heightPx}>
        <Path d={pathOf(curveSegments(series, { xToPx, yToPx, fromX, toX }))} stroke={colors.text} strokeWidth={1.5} fill="none" />
      </Svg>
    </View>
  );
}
