import { View } from 'react-native';
import Svg, { Circle, G, Line, Path } from 'react-native-svg';
import { useTheme, type ThemeColors } from '@/components/theme';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatDeflectionUncertain } from '@/shared/lib/format-angle';
import { residualRms } from '@/shared/evaluation/residual-rms';
import type { FitCurve } from '@/shared/evaluation/result';
import { Axes, mapInto, roomy, type FrameBox, type FrameScale } from './chart-frame';
import { pathOf } from './curve';
import { HiddenTable } from './hidden-table';
import { residualsOf } from './residuals';
import { laneOf } from './strip-model';
import { useWidth } from './use-width';

export interface FitPlotProps {
  curve: FitCurve;
  /** One scale of deflection for several dwells side by side, mrad; the dwell's own when absent. */
  rangeMrad?: [number, number] | undefined;
}

const left = 58;
const top = 22;
const mainPx = 150;
const residualPx = 68;
const betweenPx = 30;
const heightPx = top + mainPx + betweenPx + residualPx + 40;

/** Binned data and the fitted curve of one dwell; below, what is left of the data, in µrad. */
export function FitPlot({ curve, rangeMrad }: FitPlotProps) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth(320);
  const minutes = curve.tS.map((t) => t / 60);
  const dataMrad = curve.dataRad.map((y) => y * 1e3);
  const modelMrad = curve.modelRad.map((y) => y * 1e3);
  const residualUrad = residualsOf(curve).map((rest) => rest * 1e6);
  const x: [number, number] = [Math.min(0, minutes[0] ?? 0), minutes.at(-1) ?? 1];
  const reach = Math.max(1e-3, ...residualUrad.map(Math.abs)) * 1.15;
  const main = {
    box: { left, top, width: width - left - 8, height: mainPx },
    scale: { x, y: rangeMrad ?? roomy([...dataMrad, ...modelMrad]) },
  };
  const rest = {
    box: { left, top: top + mainPx + betweenPx, width: width - left - 8, height: residualPx },
    scale: { x, y: [-reach, reach] as [number, number] },
  };
  const rms = formatDeflectionUncertain(residualRms(curve));
  const title = `Dwell ${curve.seq} at ${curve.station}: fit to ${curve.tS.length} bins over ${formatDuration(curve.tS.at(-1) ?? 0)}, residual rms ${rms}.`;
  return (
    <View onLayout={onLayout} className="w-full min-w-0" testID="fit-plot">
      <View role="img" aria-label={title} style={{ height: heightPx }}>
        <Svg width={width} height={heightPx} viewBox={`0 0 ${width} ${heightPx}`} aria-hidden>
          <Axes {...main} colors={colors} yUnit="mrad" showX={false} />
          <Curve {...main} points={{ x: minutes, data: dataMrad, model: modelMrad }} colors={colors} station={curve.station} />
          <Axes {...rest} colors={colors} yUnit="data − fit, µrad" yTicks={4} xUnit="min" />
          <Residuals {...rest} x={minutes} y={residualUrad} colors={colors} />
        </Svg>
      </View>
      <FitTable title={title} curve={curve} />
    </View>
  );
}

interface CurveProps {
  box: FrameBox;
  scale: FrameScale;
  points: { x: number[]; data: number[]; model: number[] };
  colors: ThemeColors;
  station: string;
}

function Curve({ box, scale, points, colors, station }: CurveProps) {
  const { toX, toY } = mapInto(box, scale);
  const lane = laneOf(station);
  const color = lane === 'near' ? colors.near : lane === 'far' ? colors.far : colors.dim;
  const line = points.x.map((x, index) => [toX(x), toY(points.model[index] as number)] as [number, number]);
  return (
    <G>
      {points.x.map((x, index) => (
        <Circle key={x} cx={toX(x)} cy={toY(points.data[index] as number)} r={2.2} fill={color} />
      ))}
      <Path d={pathOf([line])} stroke={colors.text} strokeWidth={1.5} fill="none" />
    </G>
  );
}

function Residuals({ box, scale, x, y, colors }: { box: FrameBox; scale: FrameScale; x: number[]; y: number[]; colors: ThemeColors }) {
  const { toX, toY } = mapInto(box, scale);
  return (
    <G>
      <Line x1={box.left} x2={box.left + box.width} y1={toY(0)} y2={toY(0)} stroke={colors.faint} strokeWidth={1.5} />
      {x.map((at, index) => (
        <Circle key={at} cx={toX(at)} cy={toY(y[index] as number)} r={1.8} fill={colors.text} opacity={0.8} />
      ))}
    </G>
  );
}

function FitTable({ title, curve }: { title: string; curve: FitCurve }) {
  const stride = Math.max(1, Math.ceil(curve.tS.length / 24));
  const rows = curve.tS.flatMap((t, index) => {
    if (index % stride !== 0) return [];
    const data = curve.dataRad[index] as number;
    return [[formatDuration(t), (data * 1e3).toFixed(4), ((data - (curve.modelRad[index] as number)) * 1e6).toFixed(1)]];
  });
  return <HiddenTable caption={title} columns={['Time in the dwell', 'Deflection in mrad', 'Data minus fit in µrad']} rows={rows} />;
}
