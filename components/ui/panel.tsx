import type { ReactNode } from 'react';
import { View } from 'react-native';
import { Heading, Label } from './text';

interface PanelProps {
  children?: ReactNode;
  /** A coloured left edge for advice and findings; the words must say the same. */
  edge?: 'lamp' | 'danger' | 'far' | 'near' | 'good';
  className?: string;
  testID?: string;
}

const edges = {
  lamp: 'border-l-4 border-lamp',
  danger: 'border-l-4 border-danger',
  far: 'border-l-4 border-far',
  near: 'border-l-4 border-near',
  good: 'border-l-4 border-good',
};

/** Holds what belongs together. Panels do not stand in panels. */
export function Panel({ children, edge, className = '', testID }: PanelProps) {
  return (
    <View testID={testID} className={`rounded-panel bg-panel p-4 ${edge === undefined ? '' : edges[edge]} ${className}`}>
      {children}
    </View>
  );
}

interface SectionProps {
  title: string;
  remark?: string;
  trailing?: ReactNode;
  children?: ReactNode;
  className?: string;
}

/** A heading of level 2 with what stands under it. */
export function Section({ title, remark, trailing, children, className = '' }: SectionProps) {
  return (
    <View className={`gap-3 ${className}`}>
      <View className="min-h-8 flex-row items-center justify-between gap-3">
        <Heading level={2} className="shrink">
          {title}
        </Heading>
        {trailing}
      </View>
      {remark === undefined ? null : <Label>{remark}</Label>}
      {children}
    </View>
  );
}

interface RowProps {
  children?: ReactNode;
  className?: string;
  last?: boolean;
}

/** One row of a list with a hairline under it. */
export function Row({ children, className = '', last = false }: RowProps) {
  return (
    <View className={`min-h-target flex-row items-center gap-3 py-2 ${last ? '' : 'border-b border-line'} ${className}`}>{children}</View>
  );
}
