import { memo } from 'react';
import Svg, { Circle, G, Line, Path, Rect } from 'react-native-svg';
import { useTheme, type ThemeColors } from '@/components/theme';
import { pathOf } from './curve';
import type { StripBlock, StripLayout, StripSwing } from './strip-geometry';

interface DrawingProps {
  layout: StripLayout;
  widthPx: number;
  heightPx: number;
  mini: boolean;
}

/** The picture of a strip. Colour never stands alone: lane, mark and line style say the same. */
export const StripDrawing = memo(function StripDrawing({ layout, widthPx, heightPx, mini }: DrawingProps) {
  const { colors } = useTheme();
  const line = mini ? 1.3 : layout.dense ? 1.4 : 1.9;
  const future = layout.onlyPlanned ? 1 : 0.38;
  return (
    <Svg width={widthPx} height={heightPx} viewBox={`0 0 ${widthPx} ${heightPx}`} aria-hidden>
      {mini ? null : layout.swings.map((swing) => <SwingLine key={swing.key} swing={swing} colors={colors} />)}
      {layout.equilibria.map(({ x1, x2, y, planned }) => (
        <Line
          key={`${x1} ${y}`}
          x1={x1}
          x2={x2}
          y1={y}
          y2={y}
          stroke={colors.dim}
          strokeWidth={1}
          strokeDasharray="2 4"
          opacity={planned ? 0.6 : 0.95}
        />
      ))}
      <Path
        d={pathOf(layout.predicted)}
        stroke={colors.text}
        strokeWidth={layout.onlyPlanned ? line : line * 0.85}
        fill="none"
        opacity={future}
        strokeLinejoin="round"
      />
      <Path d={pathOf(layout.measured)} stroke={colors.text} strokeWidth={line} fill="none" strokeLinejoin="round" strokeLinecap="round" />
      {layout.blocks.map((block) => (
        <Block key={block.key} block={block} colors={colors} mini={mini} faded={block.phase === 'planned' && !layout.onlyPlanned} />
      ))}
      {layout.nowX === null ? null : (
        <G>
          <Line x1={layout.nowX} x2={layout.nowX} y1={0} y2={heightPx} stroke={colors.lamp} strokeWidth={mini ? 1.5 : 2} />
          {layout.nowDot === null ? null : <Circle cx={layout.nowDot.x} cy={layout.nowDot.y} r={mini ? 2.5 : 4.5} fill={colors.lamp} />}
        </G>
      )}
    </Svg>
  );
});

function SwingLine({ swing, colors }: { swing: StripSwing; colors: ThemeColors }) {
  const { x1, y1, x2, y2, planned, selected } = swing;
  const stroke = selected ? colors.lamp : colors.faint;
  return (
    <Line
      x1={x1}
      y1={y1}
      x2={x2}
      y2={y2}
      stroke={stroke}
      strokeWidth={selected ? 3 : 1}
      opacity={planned && !selected ? 0.35 : 0.7}
      strokeLinecap="round"
    />
  );
}

interface BlockProps {
  block: StripBlock;
  colors: ThemeColors;
  mini: boolean;
  faded: boolean;
}

function Block({ block, colors, mini, faded }: BlockProps) {
  const { x, y, width, height, lane, bad, cutShort, selected } = block;
  const color = lane === 'near' ? colors.near : lane === 'far' ? colors.far : colors.faint;
  const radius = Math.min(mini ? 1.5 : 3, width / 2, height / 2);
  const hollow = bad || cutShort || (!block.measured && lane !== 'other');
  return (
    <G>
      <G opacity={faded ? 0.45 : 1}>
        <Rect
          x={hollow ? x + 0.75 : x}
          y={hollow ? y + 0.75 : y}
          width={Math.max(0.5, hollow ? width - 1.5 : width)}
          height={hollow ? height - 1.5 : height}
          rx={radius}
          fill={color}
          fillOpacity={hollow ? 0.22 : 1}
          stroke={hollow ? color : 'none'}
          strokeWidth={hollow ? 1.5 : 0}
          strokeDasharray={cutShort ? '3 2' : undefined}
        />
        {bad && !mini && width >= 8 ? <Path d={crossOf(block)} stroke={colors.danger} strokeWidth={2} strokeLinecap="round" /> : null}
        {block.marked && !bad ? <Path d={markOf(block)} fill={hollow ? color : colors.ink} /> : null}
      </G>
      {selected ? (
        <Rect
          x={x + 1}
          y={y + 1}
          width={Math.max(1, width - 2)}
          height={Math.max(1, height - 2)}
          rx={radius}
          fill="none"
          stroke={colors.text}
          strokeWidth={2.5}
        />
      ) : null}
    </G>
  );
}

/** A triangle that points the way the masses stand: up for near, down for far. */
function markOf({ x, y, width, height, lane }: StripBlock): string {
  const cx = x + width / 2;
  const cy = y + height / 2;
  const half = Math.min(5, height * 0.28, width * 0.3);
  const tip = lane === 'near' ? -half * 0.85 : half * 0.85;
  return `M${cx - half} ${cy - tip}h${2 * half}L${cx} ${cy + tip}Z`;
}

function crossOf({ x, y, width, height }: StripBlock): string {
  const cx = x + width / 2;
  const cy = y + height / 2;
  const half = Math.min(3.5, width * 0.3);
  return `M${cx - half} ${cy - half}l${2 * half} ${2 * half}M${cx + half} ${cy - half}l${-2 * half} ${2 * half}`;
}
