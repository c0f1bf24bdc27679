import type { ReactNode } from 'react';
import { Text, type TextProps } from 'react-native';

export type Tone = 'text' | 'dim' | 'lamp' | 'near' | 'far' | 'danger' | 'good' | 'on-lamp';
export type TextSize = 13 | 15 | 17 | 20 | 24 | 30 | 44 | 60;

const tones: Record<Tone, string> = {
  text: 'text-text',
  dim: 'text-dim',
  lamp: 'text-lamp',
  near: 'text-near',
  far: 'text-far',
  danger: 'text-danger',
  good: 'text-good',
  'on-lamp': 'text-on-lamp',
};
const sizes: Record<TextSize, string> = {
  13: 'text-13',
  15: 'text-15',
  17: 'text-17',
  20: 'text-20',
  24: 'text-24',
  30: 'text-30',
  44: 'text-44',
  60: 'text-60',
};

export interface WordsProps extends Omit<TextProps, 'children'> {
  children?: ReactNode;
  tone?: Tone;
  size?: TextSize;
  strong?: boolean;
  className?: string;
}

const join = (...parts: (string | false | undefined)[]) => parts.filter(Boolean).join(' ');

/** Running text. */
export function Body({ tone = 'text', size = 15, strong = false, className, ...rest }: WordsProps) {
  return <Text {...rest} className={join('font-sans', sizes[size], tones[tone], strong ? 'font-strong' : 'font-regular', className)} />;
}

/** A small quiet line: the name of a value, a unit, a remark. */
export function Label({ tone = 'dim', size = 13, ...rest }: WordsProps) {
  return <Body tone={tone} size={size} {...rest} />;
}

interface HeadingProps extends WordsProps {
  level?: 1 | 2 | 3;
}

const headingSizes: Record<1 | 2 | 3, TextSize> = { 1: 20, 2: 17, 3: 15 };

/** A heading with its level in the outline of the page; a screen has one of level 1 (made by `Screen`). */
export function Heading({ level = 2, size, ...rest }: HeadingProps) {
  return <Body role="heading" aria-level={level} strong size={size ?? headingSizes[level]} {...rest} />;
}

interface NumProps extends WordsProps {
  /** Standard uncertainty, unit or remark beside the number, dimmer. */
  aside?: ReactNode;
  /** Weight 300, for the largest number of a screen. */
  light?: boolean;
}

/** A number in the monospaced sister with tabular figures; what stands beside it is dimmer and in the sans. */
export function Num({ tone = 'text', size = 15, strong = false, light = false, aside, className, children, ...rest }: NumProps) {
  const weight = strong ? 'font-strong' : light ? 'font-thin' : 'font-regular';
  return (
    <Text {...rest} className={join('font-mono tabular', sizes[size], tones[tone], weight, className)}>
      {children}
      {aside === undefined ? null : (
        <Text className={join('font-sans text-dim font-regular', size >= 24 ? 'text-17' : size >= 17 ? 'text-15' : 'text-13')}>
          {' '}
          {aside}
        </Text>
      )}
    </Text>
  );
}
