import type { ReactNode } from 'react';
import { View } from 'react-native';
import { Body, type Tone } from './text';

interface ChipProps {
  children: ReactNode;
  tone?: Tone;
  /** A filled dot before the words. */
  dot?: Tone;
  mono?: boolean;
  testID?: string;
}

const dots: Record<Tone, string> = {
  text: 'bg-text',
  dim: 'bg-faint',
  lamp: 'bg-lamp',
  near: 'bg-near',
  far: 'bg-far',
  danger: 'bg-danger',
  good: 'bg-good',
  'on-lamp': 'bg-on-lamp',
};

/** A small outlined word: a state, a revision. Not a button. */
export function Chip({ children, tone = 'dim', dot, mono = false, testID }: ChipProps) {
  return (
    <View testID={testID} className="flex-row items-center gap-2 self-center rounded-full border border-line px-3 py-1">
      {dot === undefined ? null : <View className={`h-2 w-2 rounded-full ${dots[dot]}`} />}
      <Body size={13} tone={tone} className={mono ? 'font-mono tabular' : ''}>
        {children}
      </Body>
    </View>
  );
}
