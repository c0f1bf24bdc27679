import type { ReactNode } from 'react';
import { View } from 'react-native';
import { SparkLine, type Series } from '@/components/charts';
import { Body, Label, Num } from '@/components/ui';
import type { ReadingRange } from '@/shared/lib/reading-range';

interface ChannelLineProps {
  name: string;
  /** What it reads, with its unit; empty where it reads nothing. */
  reading: string;
  series: Series;
  /** Null where nothing is drawn. */
  range: ReadingRange | null;
  fromUtcMs: number;
  toUtcMs: number;
  gapMs: number;
  atUtcMs?: number | undefined;
  /** Under the line. */
  remark?: ReactNode;
  testID: string;
}

/** A channel of the surroundings in one line: its name, what it reads, how it went. */
export function ChannelLine({ name, reading, series, range, remark, testID, ...time }: ChannelLineProps) {
  return (
    <View className="gap-1" testID={testID}>
      <View className="flex-row flex-wrap items-baseline justify-between gap-x-3">
        <Body className="min-w-0 shrink">{name}</Body>
        {reading === '' ? null : <Num strong>{reading}</Num>}
      </View>
      {range === null ? null : <SparkLine series={series} range={range} {...time} />}
      {remark === undefined ? null : <Label>{remark}</Label>}
    </View>
  );
}
