import { View } from 'react-native';
import Svg, { Circle, Line, Rect, Text as SvgText } from 'react-native-svg';
import { useTheme } from '@/components/theme';
import { formatFixed, UNIT_OF_G } from '@/shared/lib/format-number';
import { spokenUncertain } from '@/shared/lib/format-uncertain';
import { niceTicks } from '@/shared/lib/ticks';
import { useWidth } from './use-width';

export interface GScaleProps {
  /** m3 kg-1 s-2; u null where it is not known. */
  value: number;
  u: number | null;
  codata: { value: number; u: number };
  /** Another value to compare with, for example the true G of a simulator. */
  other?: { value: number; label: string } | undefined;
}

const heightPx = 84;
const axisY = 36;
const edgePx = 8;

/** Where G ± u (one and two u) lies beside the recommended value. Lengths, not colours, carry the meaning. */
export function GScale({ value, u, codata, other }: GScaleProps) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth(320);
  const all = [value, codata.value, ...(other ? [other.value] : [])];
  const reach = Math.max(...all) - Math.min(...all);
  const half = Math.max(reach * 0.75, (u ?? 0) * 2.8, codata.value * 1e-4);
  const middle = (Math.max(...all) + Math.min(...all)) / 2;
  const from = middle - half - reach / 4;
  const to = middle + half + reach / 4;
  const x = (g: number) => edgePx + ((g - from) / (to - from)) * (width - 2 * edgePx);
  const round = niceTicks(from * 1e11, to * 1e11, width < 420 ? 4 : 6);
  // A label needs 20 px to either side of its tick.
  const ticks = { ...round, values: round.values.filter((tick) => x(tick / 1e11) >= 20 && x(tick / 1e11) <= width - 20) };
  const band = (k: number, opacity: number, height: number) =>
    u === null ? null : (
      <Rect
        x={x(value - k * u)}
        width={Math.max(1, x(value + k * u) - x(value - k * u))}
        y={axisY - height / 2}
        height={height}
        rx={height / 2}
        fill={colors.lamp}
        opacity={opacity}
      />
    );
  const reference = other ?? { value: codata.value, label: 'CODATA' };
  const onRight = x(reference.value) < width * 0.7;
  const said = (g: number, uOf: number | null) => spokenUncertain({ value: g, u: uOf, unit: UNIT_OF_G });
  const label = `G is ${said(value, u)}; the recommended value is ${said(codata.value, codata.u)}${other ? `; ${other.label} is ${said(other.value, 0)}, exactly` : ''}.`;
  return (
    <View onLayout={onLayout} role="img" aria-label={label} style={{ height: heightPx }} testID="g-scale">
      <Svg width={width} height={heightPx} viewBox={`0 0 ${width} ${heightPx}`} aria-hidden>
        <Line x1={edgePx} x2={width - edgePx} y1={axisY} y2={axisY} stroke={colors.faint} strokeWidth={1.5} />
        {ticks.values.map((tick) => (
          <SvgTick
            key={tick}
            x={x(tick / 1e11)}
            text={formatFixed(tick, { decimals: Math.max(2, ticks.decimals) })}
            color={colors.dim}
            line={colors.faint}
          />
        ))}
        {band(2, 0.22, 12)}
        {band(1, 0.45, 12)}
        <Line x1={x(reference.value)} x2={x(reference.value)} y1={axisY - 17} y2={axisY + 10} stroke={colors.text} strokeWidth={2.5} />
        <SvgText
          x={x(reference.value) + (onRight ? 6 : -6)}
          y={axisY - 13}
          textAnchor={onRight ? 'start' : 'end'}
          fill={colors.dim}
          fontSize={13}
          fontFamily="Atkinson Hyperlegible Next"
        >
          {reference.label}
        </SvgText>
        <SvgText x={width - edgePx} y={axisY + 43} textAnchor="end" fill={colors.dim} fontSize={13} fontFamily="Atkinson Hyperlegible Next">
          {`10⁻¹¹ ${UNIT_OF_G}`}
        </SvgText>
        <Circle cx={x(value)} cy={axisY} r={6} fill={colors.lamp} stroke={colors.panel} strokeWidth={2} />
      </Svg>
    </View>
  );
}

function SvgTick({ x, text, color, line }: { x: number; text: string; color: string; line: string }) {
  return (
    <>
      <Line x1={x} x2={x} y1={axisY - 3} y2={axisY + 4} stroke={line} strokeWidth={1.5} />
      <SvgText x={x} y={axisY + 24} textAnchor="middle" fill={color} fontSize={13} fontFamily="Atkinson Hyperlegible Mono">
        {text}
      </SvgText>
    </>
  );
}
