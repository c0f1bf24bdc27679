import { View } from 'react-native';
import Svg, { Line, Path } from 'react-native-svg';
import { useTheme } from '@/components/theme';
import type { FitCurve } from '@/shared/evaluation/result';
import { mapInto } from './chart-frame';
import { residualsOf, type SharedAxes } from './residuals';
import { laneOf } from './strip-model';
import { useWidth } from './use-width';

const heightPx = 64;
const dotPx = 2.6;
const arrowPx = 7;

/** What the fit of one dwell leaves, as points about a zero line, on axes that other dwells share. Whoever shows it says in words what it is. */
export function ResidualPlot({ curve, axes }: { curve: FitCurve; axes: SharedAxes }) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth(160);
  const { toX, toY } = mapInto(
    { left: 2, top: 3, width: width - 4, height: heightPx - 6 },
    { x: axes.timeS, y: [-axes.reachRad, axes.reachRad] },
  );
  const lane = laneOf(curve.station);
  const color = lane === 'near' ? colors.near : lane === 'far' ? colors.far : colors.dim;
  const placed = residualsOf(curve).map((rest, index) => ({ rest, x: toX(curve.tS[index] as number) }));
  const points = placed
    .filter(({ rest }) => Math.abs(rest) <= axes.reachRad)
    .map(({ rest, x }) => `M${x.toFixed(1)} ${toY(rest).toFixed(1)}h0.01`);
  // Arrows at the edge, pointing to where the bin lies.
  const beyond = placed
    .filter(({ rest }) => Math.abs(rest) > axes.reachRad)
    .map(({ rest, x }) => {
      const [tip, foot] = rest > 0 ? [0, arrowPx] : [heightPx, heightPx - arrowPx];
      return `M${(x - arrowPx / 2).toFixed(1)} ${foot}L${x.toFixed(1)} ${tip}l${arrowPx / 2} ${foot - tip}z`;
    });
  return (
    <View onLayout={onLayout} className="w-full min-w-0" style={{ height: heightPx }} aria-hidden>
      <Svg width={width} height={heightPx} viewBox={`0 0 ${width} ${heightPx}`}>
        <Line x1={0} x2={width} y1={toY(0)} y2={toY(0)} stroke={colors.faint} strokeWidth={1} />
        <Path d={points.join('')} stroke={color} strokeWidth={dotPx} strokeLinecap="round" fill="none" />
        <Path d={beyond.join('')} fill={colors.text} />
      </Svg>
    </View>
  );
}
