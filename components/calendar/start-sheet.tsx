import { router, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLab, useLabMutation, useMay, wordsOf } from '@/components/api';
import { Body, Button, Icon, Label, Num, ProblemNotice, Sheet } from '@/components/ui';
import { skipStart, type CalendarItem } from '@/shared/contracts/schedules';
import { formatClock, formatDay, zoneName } from '@/shared/lib/format-time';
import { stateMarks } from './calendar-words';
import { dayWords } from './nights';
import { useRefreshCalendar } from './use-refresh-calendar';

/** One start of a schedule: when, what became of it or stands against it, and what may be done about it. */
export function StartSheet({ item, onClose }: { item: CalendarItem; onClose: () => void }) {
  const { timeZone } = useLab();
  const mayPlan = useMay('run.start');
  const refresh = useRefreshCalendar();
  const skip = useLabMutation(skipStart, () => {
    refresh();
    onClose();
  });
  const mark = stateMarks[item.state];
  const { runId } = item;
  const [due, end] = [Date.parse(item.dueAt), Date.parse(item.endsAt)];
  const send = (skipped: boolean) => skip.mutate({ params: { scheduleId: item.scheduleId }, body: { dueAt: item.dueAt, skipped } });
  return (
    <Sheet
      open
      title={item.protocolName}
      onClose={onClose}
      testID="start-sheet"
      footer={
        runId !== null ? (
          <Button
            kind="primary"
            label="Open the run"
            onPress={() => {
              onClose();
              router.push(`/runs/${runId}` as Href);
            }}
          />
        ) : !mayPlan.ok ? (
          <Label>{mayPlan.why}</Label>
        ) : item.state === 'planned' || item.state === 'blocked' ? (
          <Button icon="forward" label="Skip this start" busy={skip.isPending} onPress={() => send(true)} testID="skip-start" />
        ) : item.state === 'skipped' ? (
          <Button icon="undo" label="Take the skip back" busy={skip.isPending} onPress={() => send(false)} testID="take-skip-back" />
        ) : null
      }
    >
      <View className="flex-row items-center gap-3" testID="start-state">
        <Icon name={mark.icon} size={24} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
        <Body strong>{mark.word}</Body>
      </View>
      {item.why === '' ? null : <Body>{item.why}</Body>}
      <View className="gap-1">
        <Label>
          {item.rigName}, revision {item.protocolRevision}
        </Label>
        <Num>
          {dayWords(formatDay(due, timeZone))} {formatClock(due, { timeZone })} – {formatClock(end, { timeZone })}
        </Num>
        <Label>{zoneName(timeZone)}; the end is predicted.</Label>
      </View>
      {item.remark === null ? null : <Body tone="lamp">{item.remark}</Body>}
      {item.state === 'planned' ? (
        <Label>
          A schedule does not arm: somebody has to arm the rig before, until after the predicted end. Otherwise the start is missed.
        </Label>
      ) : null}
      {skip.isError ? <ProblemNotice title="Nothing was changed" {...wordsOf(skip.error)} /> : null}
    </Sheet>
  );
}
