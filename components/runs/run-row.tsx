import { Link, type Href } from 'expo-router';
import { View } from 'react-native';
import { Body, Icon, Label, Num } from '@/components/ui';
import type { RunSummary } from '@/shared/contracts/runs';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatClock, formatDay } from '@/shared/lib/format-time';
import { isOver, stateMark, stateWord } from './run-words';
import { RunMiniature } from './run-miniature';

interface RunRowProps {
  run: RunSummary;
  timeZone: string;
  last: boolean;
}

/** One run of a list: what it was, how it ended, and the night in miniature. */
export function RunRow({ run, timeZone, last }: RunRowProps) {
  const mark = stateMark(run.state);
  const startMs = Date.parse(run.startedAt ?? run.createdAt);
  const endMs = run.endedAt === null ? null : Date.parse(run.endedAt);
  return (
    <Link
      href={`/runs/${run.id}` as Href}
      className={`gap-2 py-3 hover:bg-panel ${last ? '' : 'border-b border-line'}`}
      style={{ display: 'flex', flexDirection: 'column' }}
      testID="run-row"
    >
      <View className="flex-row items-center gap-3">
        <Icon name={mark.icon} size={22} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
        <View className="min-w-0 flex-1">
          <Body strong numberOfLines={1}>
            {run.protocolName}
          </Body>
          <Label numberOfLines={1}>
            {run.rehearsal ? 'Rehearsal, ' : ''}
            {run.rigName}
            {run.protocolRevision > 0 ? `, revision ${run.protocolRevision}` : ', draft'}
          </Label>
        </View>
        <View className="flex-none items-end">
          <Body size={13} tone={isOver(run.state) ? 'dim' : 'lamp'}>
            {stateWord(run.state)}
          </Body>
          <Num size={13} tone="dim">
            {formatDay(startMs, timeZone)} {formatClock(startMs, { timeZone })}
          </Num>
        </View>
      </View>
      {run.startedAt === null ? null : (
        <View className="flex-row items-center gap-4 pl-9">
          <View className="min-w-0 flex-1">
            <RunMiniature run={run} timeZone={timeZone} />
          </View>
          <Label className="w-[86px] flex-none text-right font-mono tabular">
            {endMs === null ? '' : formatDuration((endMs - startMs) / 1000)}
          </Label>
        </View>
      )}
    </Link>
  );
}
