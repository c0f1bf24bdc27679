import { useState } from 'react';
import { View } from 'react-native';
import { useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Label, Panel, ProblemNotice, Section, Sheet } from '@/components/ui';
import { changeSchedule, listSchedules, type ScheduleView } from '@/shared/contracts/schedules';
import { planWords } from './calendar-words';
import { useRefreshCalendar } from './use-refresh-calendar';

/** Schedules that stand: each can be paused, continued, or ended for good. */
export function ScheduleList() {
  const query = useLabQuery(listSchedules);
  const [ending, setEnding] = useState<ScheduleView | null>(null);
  const items = query.data?.data.items ?? [];
  return (
    <Section title="Schedules">
      {query.isError ? <ProblemNotice title="The schedules could not be loaded" {...wordsOf(query.error)} /> : null}
      {query.isSuccess && items.length === 0 ? <Label>None. Each start is made by hand.</Label> : null}
      {items.map((schedule) => (
        <SchedulePanel key={schedule.id} schedule={schedule} onEnd={() => setEnding(schedule)} />
      ))}
      {ending === null ? null : <EndSheet schedule={ending} onClose={() => setEnding(null)} />}
    </Section>
  );
}

function SchedulePanel({ schedule, onEnd }: { schedule: ScheduleView; onEnd: () => void }) {
  const mayPlan = useMay('run.start');
  const refresh = useRefreshCalendar();
  const change = useLabMutation(changeSchedule, refresh);
  const paused = schedule.state === 'paused';
  const turn = () => change.mutate({ params: { scheduleId: schedule.id }, body: { state: paused ? 'active' : 'paused' } });
  return (
    <Panel className="gap-2" testID="schedule">
      <Body strong>{schedule.protocolName}</Body>
      <Body size={13}>
        {planWords(schedule.plan)}
        {paused ? ' (paused)' : ''}
      </Body>
      <Label>
        {schedule.rigName}, revision {schedule.protocolRevision}, {schedule.massSetLabel}; by {schedule.madeBy}
      </Label>
      {mayPlan.ok ? (
        <View className="flex-row gap-2">
          <Button
            icon={paused ? 'start' : 'hold'}
            label={paused ? 'Continue' : 'Pause'}
            busy={change.isPending}
            onPress={turn}
            accessibilityLabel={`${paused ? 'Continue' : 'Pause'} the schedule of ${schedule.protocolName}`}
            testID="pause-schedule"
          />
          <Button
            kind="quiet"
            label="End"
            onPress={onEnd}
            accessibilityLabel={`End the schedule of ${schedule.protocolName}`}
            testID="end-schedule"
          />
        </View>
      ) : null}
      {change.isError ? <ProblemNotice title="Nothing was changed" {...wordsOf(change.error)} /> : null}
    </Panel>
  );
}

function EndSheet({ schedule, onClose }: { schedule: ScheduleView; onClose: () => void }) {
  const refresh = useRefreshCalendar();
  const change = useLabMutation(changeSchedule, () => {
    refresh();
    onClose();
  });
  const end = () => change.mutate({ params: { scheduleId: schedule.id }, body: { state: 'ended' } });
  return (
    <Sheet
      open
      title="End the schedule"
      onClose={onClose}
      testID="end-sheet"
      footer={<Button kind="danger" label="End it for good" busy={change.isPending} onPress={end} testID="end-confirm" />}
    >
      <Body>
        {schedule.protocolName} on {schedule.rigName}: {planWords(schedule.plan)}.
      </Body>
      <Label>
        It starts no run any more. A run that is going on goes on; what it started stays in the calendar. Pausing can be taken back.
      </Label>
      {change.isError ? <ProblemNotice title="It was not ended" {...wordsOf(change.error)} /> : null}
    </Sheet>
  );
}
