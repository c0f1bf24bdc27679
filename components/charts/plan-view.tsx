import { View } from 'react-native';
import Svg, { Circle, G, Line, Path } from 'react-native-svg';
import { useTheme, type ThemeColors } from '@/components/theme';
import { formatDegrees } from '@/shared/lib/format-angle';
import type { RigDocument } from '@/shared/rig/document';
import { planLayout, polar, stationNear, type PlanLayout } from './plan-geometry';
import { laneOf, type Lane } from './strip-model';
import { useSmoothAngle } from './use-smooth-angle';

export interface PlanViewProps {
  rig: RigDocument;
  /** The turntable's real angle, deg counter-clockwise from above; null while it is not known. */
  angleDeg: number | null;
  sizePx: number;
  /** Shown as it was last known, not as it is. */
  old?: boolean | undefined;
}

const colorOf = (lane: Lane, colors: ThemeColors) => (lane === 'near' ? colors.near : lane === 'far' ? colors.far : colors.faint);

/** The turntable from above: sources, pendulum arm at rest, station ticks, keep-out arcs, at the real angle. */
export function PlanView({ rig, angleDeg, sizePx, old = false }: PlanViewProps) {
  const { colors } = useTheme();
  const shownDeg = useSmoothAngle(angleDeg);
  const layout = planLayout(rig);
  const scale = sizePx / 2;
  const px = (radius: number, deg: number) => {
    const { x, y } = polar(radius, deg);
    return { x: scale + x * scale, y: scale - y * scale };
  };
  const dot = { x: scale, y: scale };
  return (
    <View
      role="img"
      aria-label={planWords(rig, angleDeg, old)}
      style={{ width: sizePx, height: sizePx, opacity: old ? 0.45 : 1 }}
      testID="plan-view"
    >
      <Svg width={sizePx} height={sizePx} viewBox={`0 0 ${sizePx} ${sizePx}`} aria-hidden>
        <Circle cx={scale} cy={scale} r={layout.orbit * scale} fill="none" stroke={colors.line} strokeWidth={Math.max(2, sizePx / 70)} />
        {layout.keepOut.map(([from, to]) => (
          <Path key={from} d={arc(px, layout.orbit, [from, to])} stroke={colors.danger} strokeWidth={4} strokeDasharray="3 3" fill="none" />
        ))}
        {layout.ticks.map((tick) => (
          <Tick
            key={`${tick.name} ${tick.angleDeg}`}
            lane={tick.lane}
            from={px(layout.orbit * 0.94, tick.angleDeg)}
            to={px(layout.orbit * 1.06, tick.angleDeg)}
            color={colorOf(tick.lane, colors)}
          />
        ))}
        <Arm layout={layout} colors={colors} scale={scale} />
        {shownDeg === null || !layout.hasSources ? null : (
          <Sources layout={layout} px={px} angleDeg={shownDeg} scale={scale} color={sourceColor(rig, angleDeg, colors)} />
        )}
        <Circle cx={dot.x} cy={dot.y} r={3} fill={colors.lamp} />
      </Svg>
    </View>
  );
}

type ToPx = (radius: number, deg: number) => { x: number; y: number };

function Tick({ lane, from, to, color }: { lane: Lane; from: { x: number; y: number }; to: { x: number; y: number }; color: string }) {
  return (
    <Line x1={from.x} y1={from.y} x2={to.x} y2={to.y} stroke={color} strokeWidth={lane === 'other' ? 1.5 : 3.5} strokeLinecap="round" />
  );
}

function Arm({ layout, colors, scale }: { layout: PlanLayout; colors: ThemeColors; scale: number }) {
  const half = layout.arm * scale;
  return (
    <G>
      <Line x1={scale - half} x2={scale + half} y1={scale} y2={scale} stroke={colors.dim} strokeWidth={2.5} />
      {[-half, half].map((x) => (
        <Circle key={x} cx={scale + x} cy={scale} r={Math.max(5, layout.ballRadius * scale)} fill={colors.text} />
      ))}
    </G>
  );
}

function Sources({ layout, px, angleDeg, scale, color }: { layout: PlanLayout; px: ToPx; angleDeg: number; scale: number; color: string }) {
  const a = px(layout.orbit, angleDeg);
  const b = px(layout.orbit, angleDeg + 180);
  return (
    <G>
      <Line x1={a.x} y1={a.y} x2={b.x} y2={b.y} stroke={color} strokeWidth={1.5} opacity={0.8} />
      {[a, b].map(({ x, y }) => (
        <Circle key={`${x > scale}${y > scale}`} cx={x} cy={y} r={layout.sourceRadius * scale} fill={color} />
      ))}
    </G>
  );
}

function sourceColor(rig: RigDocument, angleDeg: number | null, colors: ThemeColors): string {
  const station = angleDeg === null ? null : stationNear(rig, angleDeg);
  return station === null ? colors.dim : laneOf(station) === 'other' ? colors.dim : colorOf(laneOf(station), colors);
}

function arc(px: ToPx, radius: number, [fromDeg, toDeg]: [number, number]): string {
  const steps = Math.max(2, Math.ceil((toDeg - fromDeg) / 3));
  const points = Array.from({ length: steps + 1 }, (_, index) => px(radius, fromDeg + ((toDeg - fromDeg) * index) / steps));
  return points.map(({ x, y }, index) => `${index === 0 ? 'M' : 'L'}${x.toFixed(1)} ${y.toFixed(1)}`).join('');
}

/** The plan in words: where the sources stand, and the arcs kept out. */
function planWords(rig: RigDocument, angleDeg: number | null, old = false): string {
  const keepOut = (rig.motion?.keepOut ?? []).map(([from, to]) => `${formatDegrees(from, 0)} to ${formatDegrees(to, 0)}`).join(', ');
  const station = angleDeg === null ? null : stationNear(rig, angleDeg);
  const where =
    angleDeg === null ? 'angle not known' : `at ${formatDegrees(angleDeg)}${station === null ? ', between stations' : `, ${station}`}`;
  return `Turntable from above, ${old ? 'last known ' : ''}${where}${keepOut === '' ? '' : `; kept out: ${keepOut}`}.`;
}
