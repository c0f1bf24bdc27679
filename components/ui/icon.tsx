import Svg, { Circle, Path } from 'react-native-svg';
import { useTheme, type ThemeColors } from '@/components/theme';
import { iconShapes, type IconName } from './icon-shapes';

export type { IconName } from './icon-shapes';

interface IconProps {
  name: IconName;
  size?: number;
  tone?: keyof ThemeColors;
  /** Said by a screen reader; without it the icon is decoration beside words. */
  label?: string;
}

/** Evenfall's own icons on a 24 × 24 grid. */
export function Icon({ name, size = 20, tone = 'text', label }: IconProps) {
  const { colors } = useTheme();
  const color = colors[tone];
  const shape = iconShapes[name];
  const accessible = label === undefined ? ({ 'aria-hidden': true } as const) : ({ role: 'img', 'aria-label': label } as const);
  return (
    <Svg width={size} height={size} viewBox="0 0 24 24" fill="none" style={{ flexShrink: 0 }} {...accessible}>
      {shape.lines?.map((d) => (
        <Path key={d} d={d} stroke={color} strokeWidth={1.8} strokeLinecap="round" strokeLinejoin="round" />
      ))}
      {shape.fills?.map((d) => (
        <Path key={d} d={d} fill={color} />
      ))}
      {shape.dots?.map(([x, y, r]) => (
        <Circle key={`${x} ${y}`} cx={x} cy={y} r={r} fill={color} />
      ))}
      {shape.rings?.map(([x, y, r]) => (
        <Circle key={`${x} ${y}`} cx={x} cy={y} r={r} stroke={color} strokeWidth={1.8} />
      ))}
    </Svg>
  );
}
