import { View } from 'react-native';
import { TextLink } from '@/components/runs/recent-steps';
import { Body, Icon, Label, Num, Panel, Section, type IconName } from '@/components/ui';
import type { MorningSheet } from '@/shared/contracts/morning';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatClock } from '@/shared/lib/format-time';

/** What cost most, with the way to its row of the step log. */
export function WorstMoments({ worst, runId, timeZone }: Pick<MorningSheet, 'worst'> & { runId: string; timeZone: string }) {
  if (worst.length === 0) return null;
  return (
    <Section title="Worst moments">
      <Panel className="gap-3" testID="worst-moments">
        {worst.map(({ seq, at, words, s }) => (
          <View key={seq} className="flex-row items-center gap-3">
            <View className="min-w-0 shrink grow">
              <Body>
                <Num>{formatClock(Date.parse(at), { timeZone })}</Num>, {formatDuration(s)}
              </Body>
              <Label>{words}</Label>
            </View>
            <TextLink href={`/runs/${runId}/log?row=${seq}`} label={`Row ${seq}`} />
            <TextLink href={`/runs/${runId}/replay?at=${at}`} label="Replay" />
          </View>
        ))}
      </Panel>
    </Section>
  );
}

const acts: Record<MorningSheet['next'][number]['act'], { icon: IconName; tone: 'good' | 'lamp'; said: string }> = {
  go: { icon: 'start', tone: 'good', said: 'go' },
  wait: { icon: 'wait', tone: 'lamp', said: 'wait' },
  first: { icon: 'warning', tone: 'lamp', said: 'first' },
};

/** What to do before the next night. */
export function WhatNext({ next }: Pick<MorningSheet, 'next'>) {
  if (next.length === 0) return null;
  return (
    <Section title="The next night">
      <Panel className="gap-3" testID="next-night">
        {next.map(({ act, words }) => (
          <View key={words} className="flex-row items-start gap-3">
            <Icon name={acts[act].icon} size={18} tone={acts[act].tone} label={acts[act].said} />
            <Body className="min-w-0 shrink">{words}</Body>
          </View>
        ))}
      </Panel>
    </Section>
  );
}
