import { View } from 'react-native';
import Svg, { Circle, G, Line, Rect } from 'react-native-svg';
import { useTheme } from '@/components/theme';
import { formatDeflectionUncertain } from '@/shared/lib/format-angle';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { Axes, mapInto, roomy } from './chart-frame';
import { HiddenTable } from './hidden-table';
import { reversalPoints } from '@/shared/evaluation/reversal-points';
import { useWidth } from './use-width';

const left = 66;
const top = 22;
const plotPx = 130;
const heightPx = top + plotPx + 40;

/** Near − far at each reversal, with the mean and its standard uncertainty as a band; no band where u is not known. */
export function ReversalPlot({ result }: { result: Pick<EvaluationResult, 'dwells' | 'reversal_rad'> }) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth(320);
  const points = reversalPoints(result.dwells);
  const mean = result.reversal_rad;
  if (points.length === 0 || mean === null) return null;
  const meanMrad = mean.value * 1e3;
  const uMrad = mean.u === null ? null : mean.u * 1e3;
  const values = points.map((point) => point.rad * 1e3);
  const box = { left, top, width: width - left - 8, height: plotPx };
  const scale = {
    x: [0.5, points.length + 0.5] as [number, number],
    y: roomy([...values, meanMrad - (uMrad ?? 0) * 1.5, meanMrad + (uMrad ?? 0) * 1.5]),
  };
  const { toX, toY } = mapInto(box, scale);
  const words = `Near minus far at ${points.length} reversals; mean ${formatDeflectionUncertain({ value: mean.value, u: mean.u })}.`;
  return (
    <View onLayout={onLayout} className="w-full min-w-0" testID="reversal-plot">
      <View role="img" aria-label={words} style={{ height: heightPx }}>
        <Svg width={width} height={heightPx} viewBox={`0 0 ${width} ${heightPx}`} aria-hidden>
          <Axes
            box={box}
            scale={scale}
            colors={colors}
            yUnit="near − far, mrad"
            xUnit="reversal"
            xTicks={Math.min(6, points.length)}
            formatX={(x) => (Number.isInteger(x) ? String(x) : '')}
          />
          <G>
            {uMrad === null ? null : (
              <Rect
                x={box.left}
                width={box.width}
                y={toY(meanMrad + uMrad)}
                height={Math.max(1, toY(meanMrad - uMrad) - toY(meanMrad + uMrad))}
                fill={colors.lamp}
                opacity={0.28}
              />
            )}
            <Line x1={box.left} x2={box.left + box.width} y1={toY(meanMrad)} y2={toY(meanMrad)} stroke={colors.lamp} strokeWidth={1.5} />
            {points.map((point, index) => (
              <Circle key={point.index} cx={toX(point.index)} cy={toY(values[index] as number)} r={3.2} fill={colors.text} />
            ))}
          </G>
        </Svg>
      </View>
      <HiddenTable
        caption={words}
        columns={['Reversal', 'Rows of the step log', 'Near minus far in mrad']}
        rows={points.map((point) => [String(point.index), point.seqs.join(' and '), (point.rad * 1e3).toFixed(4)])}
      />
    </View>
  );
}
