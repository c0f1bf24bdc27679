import { useState } from 'react';
import { View } from 'react-native';
import Svg, { Path } from 'react-native-svg';
import { useTheme } from '@/components/theme';
import type { Series } from './curve';

interface SparkLineProps {
  series: Series;
  /** UTC ms at the left and at the right edge. */
  fromUtcMs: number;
  toUtcMs: number;
  heightPx?: number;
  /** Samples further apart than this are not joined: a gap is drawn as a gap. */
  gapMs: number;
}

/** A channel as one small line without axes, least to greatest over its height; the figures stand beside it. */
export function SparkLine({ series, fromUtcMs, toUtcMs, heightPx = 28, gapMs }: SparkLineProps) {
  const { colors } = useTheme();
  const [widthPx, setWidthPx] = useState(0);
  return (
    <View aria-hidden style={{ height: heightPx }} onLayout={({ nativeEvent }) => setWidthPx(nativeEvent.layout.width)}>
      {widthPx === 0 ? null : (
        <Svg width={widthPx} height={heightPx}>
          <Path
            d={sparkPath(series, { fromUtcMs, toUtcMs, gapMs, widthPx, heightPx })}
            stroke={colors.dim}
            strokeWidth={1.5}
            fill="none"
            strokeLinejoin="round"
            strokeLinecap="round"
          />
        </Svg>
      )}
    </View>
  );
}

interface SparkFrame extends Pick<SparkLineProps, 'fromUtcMs' | 'toUtcMs' | 'gapMs'> {
  widthPx: number;
  heightPx: number;
}

/** The line as an SVG path, px; a channel that stays the same runs through the middle. */
export function sparkPath({ x, y }: Series, { fromUtcMs, toUtcMs, gapMs, widthPx, heightPx }: SparkFrame): string {
  const values = Array.from(y).filter(Number.isFinite);
  const [least, greatest] = [Math.min(...values), Math.max(...values)];
  const edge = 2;
  const across = (at: number) => (widthPx * (at - fromUtcMs)) / Math.max(1, toUtcMs - fromUtcMs);
  const up = (value: number) =>
    greatest === least ? heightPx / 2 : heightPx - edge - ((heightPx - 2 * edge) * (value - least)) / (greatest - least);
  let path = '';
  let last = -Infinity;
  for (let i = 0; i < x.length; i += 1) {
    const [at, value] = [x[i] as number, y[i] as number];
    if (!Number.isFinite(value)) continue;
    path += `${at - last > gapMs ? 'M' : 'L'}${across(at).toFixed(1)} ${up(value).toFixed(1)}`;
    last = at;
  }
  return path;
}
