import { View } from 'react-native';
import Svg, { Circle, G, Line, Path } from 'react-native-svg';
import { useTheme } from '@/components/theme';
import type { ResidualAllanPoint } from '@/shared/evaluation/residual-allan';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatSignificant } from '@/shared/lib/format-number';
import { formatExact, formatUncertain } from '@/shared/lib/format-uncertain';
import { Axes, mapInto } from './chart-frame';
import { pathOf } from './curve';
import { HiddenTable } from './hidden-table';
import { logTicks } from '@/shared/lib/ticks';
import { useWidth } from './use-width';

const left = 58;
const top = 22;
const plotPx = 170;
const heightPx = top + plotPx + 40;
/** Room around the outermost points, decades. */
const room = 0.12;
const micro = (rad: number) => rad * 1e6;

const spanOf = (values: readonly number[]): [number, number] => [Math.min(...values) - room, Math.max(...values) + room];

/** A deviation of Allan's family, by its name, over averaging time, both logarithmic, with ± u, and the line that white noise would follow. */
export function AllanPlot({ points, words, name }: { points: readonly ResidualAllanPoint[]; words: string; name: string }) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth(320);
  const box = { left, top, width: width - left - 10, height: plotPx };
  const bars = points.map(({ tauS, deviationRad, u }) => ({
    x: Math.log10(tauS),
    y: Math.log10(micro(deviationRad)),
    low: Math.log10(micro(Math.max(deviationRad - u, deviationRad / 10))),
    high: Math.log10(micro(deviationRad + u)),
  }));
  const white = points.map(({ tauS, whiteRad }): [number, number] => [Math.log10(tauS), Math.log10(micro(whiteRad))]);
  const scale = {
    x: spanOf(bars.map(({ x }) => x)),
    y: spanOf([...bars.flatMap(({ low, high }) => [low, high]), ...white.map(([, y]) => y)]),
  };
  const { toX, toY } = mapInto(box, scale);
  const plain = (log: number) => formatSignificant(10 ** log, 1);
  return (
    <View onLayout={onLayout} className="w-full min-w-0" testID="allan-plot">
      <View role="img" aria-label={words} style={{ height: heightPx }}>
        <Svg width={width} height={heightPx} viewBox={`0 0 ${width} ${heightPx}`} aria-hidden>
          <Axes
            box={box}
            scale={scale}
            colors={colors}
            yUnit={`${name}, µrad`}
            xUnit="averaging time, s"
            at={{ x: logTicks(...scale.x), y: logTicks(...scale.y) }}
            formatX={plain}
            formatY={plain}
          />
          <Path
            d={pathOf([white.map(([x, y]): [number, number] => [toX(x), toY(y)])])}
            stroke={colors.dim}
            strokeWidth={1.5}
            strokeDasharray="5 4"
            fill="none"
          />
          {bars.map(({ x, y, low, high }) => (
            <G key={x}>
              <Line x1={toX(x)} x2={toX(x)} y1={toY(low)} y2={toY(high)} stroke={colors.text} strokeWidth={1.5} />
              <Circle cx={toX(x)} cy={toY(y)} r={3.5} fill={colors.lamp} />
            </G>
          ))}
        </Svg>
      </View>
      <HiddenTable
        caption={words}
        columns={['Averaging time', `${name} with u`, 'White noise would have']}
        rows={points.map(({ tauS, deviationRad, u, whiteRad }) => [
          formatDuration(tauS),
          formatUncertain({ value: micro(deviationRad), u: micro(u), unit: 'µrad' }),
          formatExact({ value: micro(whiteRad), unit: 'µrad' }),
        ])}
      />
    </View>
  );
}
