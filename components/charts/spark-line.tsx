import { memo, useMemo, useState } from 'react';
import { View } from 'react-native';
import Svg, { Line, Path } from 'react-native-svg';
import { useTheme } from '@/components/theme';
import type { ReadingRange } from '@/shared/lib/reading-range';
import type { Series } from './curve';
import { sparkPath } from './spark-path';

interface SparkLineProps {
  series: Series;
  /** UTC ms at the left and at the right edge. */
  fromUtcMs: number;
  toUtcMs: number;
  heightPx?: number;
  /** Of the series. */
  range: ReadingRange;
  /** Where a line stands for the moment that is read out. */
  atUtcMs?: number | undefined;
  /** Samples further apart than this are not joined: a gap is drawn as a gap. */
  gapMs: number;
}

/** A channel as one small line without axes, least to greatest over its height; the figures stand beside it. */
export const SparkLine = memo(function SparkLine({ series, range, fromUtcMs, toUtcMs, heightPx = 28, gapMs, atUtcMs }: SparkLineProps) {
  const { colors } = useTheme();
  const [widthPx, setWidthPx] = useState(0);
  const d = useMemo(
    () => (widthPx === 0 ? '' : sparkPath(series, { range, fromUtcMs, toUtcMs, gapMs, widthPx, heightPx })),
    [series, range, fromUtcMs, toUtcMs, gapMs, widthPx, heightPx],
  );
  const atPx = atUtcMs === undefined ? null : (widthPx * (atUtcMs - fromUtcMs)) / Math.max(1, toUtcMs - fromUtcMs);
  return (
    <View aria-hidden style={{ height: heightPx }} onLayout={({ nativeEvent }) => setWidthPx(nativeEvent.layout.width)}>
      {widthPx === 0 ? null : (
        <Svg width={widthPx} height={heightPx}>
          <Path d={d} stroke={colors.dim} strokeWidth={1.5} fill="none" strokeLinejoin="round" strokeLinecap="round" />
          {atPx === null ? null : <Line x1={atPx} x2={atPx} y1={0} y2={heightPx} stroke={colors.lamp} strokeWidth={2} />}
        </Svg>
      )}
    </View>
  );
});
