import { View } from 'react-native';
import { Body, Icon, Label, type IconName } from '@/components/ui';
import type { ThemeColors } from '@/components/theme';
import { formatClock } from '@/shared/lib/format-time';
import { spokenStage, type Stages, type StageState } from './intervention';
import { useCalm } from './use-now';

const marks: Record<StageState, { icon: IconName; tone: keyof ThemeColors }> = {
  waiting: { icon: 'other', tone: 'faint' },
  now: { icon: 'wait', tone: 'lamp' },
  done: { icon: 'passed', tone: 'good' },
  failed: { icon: 'failed', tone: 'danger' },
};

const titles = { hold: 'Hold', 'hold-after-dwell': 'Hold after this dwell', stop: 'Stop' } as const;
const endWords = { hold: 'standing still', 'hold-after-dwell': 'standing still', stop: 'standing still' } as const;

interface StagesProps {
  stages: Stages;
  timeZone: string;
}

/** Sent, the server has it, the controller confirmed: apart, because only the third means that the turntable stands still. */
export function InterventionStages({ stages, timeZone }: StagesProps) {
  const clock = (utcMs: number) => formatClock(utcMs, { timeZone, precision: 'ms' });
  const { server, controller, act, by, sentence } = stages;
  const spoken = useCalm(spokenStage(stages, clock), 1000);
  const failed = server.state === 'failed';
  return (
    <View className="gap-2" testID="intervention-stages">
      <View className="sr-only" role={failed ? 'alert' : 'status'}>
        <Body>{spoken}</Body>
      </View>
      <Label tone="text" aria-hidden>
        {titles[act]}
        {by === null ? '' : `, by ${by}`}
      </Label>
      <View className="flex-row gap-2" aria-hidden>
        <Stage state={stages.sent} title="Sent" detail="" />
        <Stage
          state={server.state}
          title="Server has it"
          detail={server.atMs === null ? (server.state === 'failed' ? 'no' : '…') : clock(server.atMs)}
        />
        <Stage
          state={controller.state}
          title={controller.state === 'done' ? `Controller: ${endWords[act]}` : 'Controller'}
          detail={controller.atMs === null ? (server.state === 'done' ? '…' : '') : clock(controller.atMs)}
        />
      </View>
      {sentence === '' ? null : (
        <Body size={13} tone={failed ? 'danger' : 'text'} aria-hidden>
          {sentence}
        </Body>
      )}
    </View>
  );
}

/** One stage on the way of an act: its mark, its name, and when it was reached. */
export function Stage({ state, title, detail }: { state: StageState; title: string; detail: string }) {
  const mark = marks[state];
  return (
    <View
      className={`min-w-0 flex-row items-start gap-1.5 ${detail === '' && title === 'Sent' ? 'flex-none pr-2' : 'flex-1'} ${state === 'waiting' ? 'opacity-70' : ''}`}
    >
      <Icon name={mark.icon} size={16} tone={mark.tone} />
      <View className="min-w-0 shrink">
        <Label tone={state === 'waiting' ? 'dim' : 'text'}>{title}</Label>
        {detail === '' ? null : <Label className="whitespace-nowrap font-mono tabular">{detail}</Label>}
      </View>
    </View>
  );
}
