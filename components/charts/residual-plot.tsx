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

/** What the fit of one dwell leaves, as points about a zero line, on axes that other dwells share. Whoever shows it says in words what it is. */
export function ResidualPlot({ curve, axes }: { curve: FitCurve; axes: SharedAxes }) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth(160);
  const { toX, toY } = mapInto(
    { left: 2, top: 3, width: width - 4, height: heightPx - 6 },
    { x: axes.timeS, y: [-axes.reachRad, axes.reachRad] },
  );
  const lane = laneOf(curve.station);
  const points = residualsOf(curve).map((rest, index) => `M${toX(curve.tS[index] as number).toFixed(1)} ${toY(rest).toFixed(1)}h0.01`);
  return (
    <View onLayout={onLayout} className="w-full min-w-0" style={{ height: heightPx }} aria-hidden>
      <Svg width={width} height={heightPx} viewBox={`0 0 ${width} ${heightPx}`}>
        <Line x1={0} x2={width} y1={toY(0)} y2={toY(0)} stroke={colors.faint} strokeWidth={1} />
        <Path
          d={points.join('')}
          stroke={lane === 'near' ? colors.near : lane === 'far' ? colors.far : colors.dim}
          strokeWidth={dotPx}
          strokeLinecap="round"
          fill="none"
        />
      </Svg>
    </View>
  );
}
