import { useState } from 'react';
import { Pressable, View } from 'react-native';
import { fieldErrors, serverNowMs, useLab, useLabMutation, useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Field, Icon, Label, Loading, ProblemNotice, Select, Sheet, Tabs } from '@/components/ui';
import { listProtocols } from '@/shared/contracts/protocols';
import { getRig, listRigs } from '@/shared/contracts/rigs';
import { makeSchedule } from '@/shared/contracts/schedules';
import { formatClock, formatDay, zoneName } from '@/shared/lib/format-time';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { schedulePlanSchema, weekdays, type SchedulePlan, type Weekday } from '@/shared/schedule/plan';
import { weekdayWords } from './calendar-words';
import { dayWords } from './nights';
import { useRefreshCalendar } from './use-refresh-calendar';

const usualTime = '22:00';
const shownStarts = 3;

interface When {
  kind: SchedulePlan['kind'];
  time: string;
  date: string;
  days: readonly Weekday[];
  until: string;
}

const planOf = ({ kind, time, date, days, until }: When): SchedulePlan =>
  kind === 'once' ? { kind, date, time } : { kind, days: [...days], time, from: date, until: until === '' ? null : until };

/** A run that starts by itself: what, on which rig, with which masses, when. The next starts are shown while it is written. */
export function ScheduleSheet({ onClose }: { onClose: () => void }) {
  const rigs = useLabQuery(listRigs).data?.data.items;
  const protocols = useLabQuery(listProtocols).data?.data.items.filter(({ latestRevision }) => latestRevision !== null);
  if (rigs === undefined || protocols === undefined)
    return (
      <Sheet open title="Schedule a run" onClose={onClose} testID="schedule-sheet">
        <Loading />
      </Sheet>
    );
  if (rigs.length === 0 || protocols.length === 0)
    return (
      <Sheet open title="Schedule a run" onClose={onClose} testID="schedule-sheet">
        <Body>A schedule needs a rig and an issued protocol. Write a protocol under Protocols and issue it.</Body>
      </Sheet>
    );
  return <ScheduleForm rigs={rigs} protocols={protocols} onClose={onClose} />;
}

interface FormProps {
  rigs: readonly { id: string; name: string }[];
  protocols: readonly { id: string; name: string; latestRevision: number | null }[];
  onClose: () => void;
}

function ScheduleForm({ rigs, protocols, onClose }: FormProps) {
  const { timeZone } = useLab();
  const refresh = useRefreshCalendar();
  const [rigId, setRigId] = useState(rigs[0]?.id ?? '');
  const [protocolId, setProtocolId] = useState(protocols[0]?.id ?? '');
  const [chosenMassSet, setChosenMassSet] = useState('');
  const [notes, setNotes] = useState('');
  const [when, setWhen] = useState<When>({
    kind: 'once',
    time: usualTime,
    date: formatDay(serverNowMs(), timeZone),
    days: ['mon', 'tue', 'wed', 'thu', 'fri'],
    until: '',
  });
  const massSets = useLabQuery(getRig, { params: { rigId } }).data?.data.massSets ?? [];
  const massSetId = massSets.find(({ id }) => id === chosenMassSet)?.id ?? massSets[0]?.id ?? '';
  const protocol = protocols.find(({ id }) => id === protocolId);
  const send = useLabMutation(makeSchedule, () => {
    refresh();
    onClose();
  });
  const errors = fieldErrors(send.error);
  const submit = () =>
    send.mutate({
      body: { rigId, protocolId, revision: protocol?.latestRevision ?? 1, massSetId, plan: planOf(when), notes: notes.trim() },
    });
  return (
    <Sheet
      open
      title="Schedule a run"
      onClose={onClose}
      testID="schedule-sheet"
      footer={
        <>
          <Label>A schedule does not arm: somebody is at the rig before, or the start is missed.</Label>
          <Button
            kind="primary"
            size="action"
            icon="calendar"
            label="Schedule"
            disabled={massSetId === ''}
            busy={send.isPending}
            onPress={submit}
            testID="schedule-confirm"
          />
        </>
      }
    >
      <Select
        label="Rig"
        value={rigId}
        options={rigs.map(({ id, name }) => ({ value: id, label: name }))}
        onChange={setRigId}
        testID="schedule-rig"
      />
      <Select
        label="Protocol"
        value={protocolId}
        options={protocols.map(({ id, name, latestRevision }) => ({ value: id, label: `${name}, revision ${String(latestRevision)}` }))}
        onChange={setProtocolId}
        hint="The revision stays as it is now; a later one needs a new schedule."
        testID="schedule-protocol"
      />
      <Select
        label="Mass set"
        value={massSetId}
        options={massSets.map(({ id, label }) => ({ value: id, label }))}
        onChange={setChosenMassSet}
        error={massSets.length === 0 ? 'the rig has no mass set yet; a keeper adds one on the rig page' : undefined}
      />
      <WhenFields when={when} onChange={setWhen} errors={errors} />
      <NextStarts when={when} timeZone={timeZone} />
      <Field label="Notes" value={notes} onChange={setNotes} placeholder="what this series is for" />
      {send.isError ? <ProblemNotice title="Nothing was scheduled" {...wordsOf(send.error)} /> : null}
    </Sheet>
  );
}

function WhenFields({ when, onChange, errors }: { when: When; onChange: (when: When) => void; errors: Record<string, string> }) {
  const set = (change: Partial<When>) => onChange({ ...when, ...change });
  return (
    <View className="gap-4">
      <Tabs
        label="How often"
        value={when.kind}
        options={[
          { value: 'once', label: 'Once' },
          { value: 'weekly', label: 'On days of the week' },
        ]}
        onChange={(kind) => set({ kind })}
        testID="schedule-kind"
      />
      {when.kind === 'weekly' ? <Days days={when.days} onChange={(days) => set({ days })} error={errors['plan.days']} /> : null}
      <View className="flex-row gap-3 *:flex-1">
        <Field
          label={when.kind === 'once' ? 'Day' : 'First day'}
          type="date"
          value={when.date}
          onChange={(date) => set({ date })}
          error={errors['plan.date'] ?? errors['plan.from']}
          testID="schedule-date"
        />
        <Field
          label="Time"
          type="time"
          value={when.time}
          onChange={(time) => set({ time })}
          error={errors['plan.time']}
          testID="schedule-time"
        />
      </View>
      {when.kind === 'weekly' ? (
        <Field
          label="Last day"
          type="date"
          value={when.until}
          onChange={(until) => set({ until })}
          hint="Empty: without an end."
          error={errors['plan.until']}
        />
      ) : null}
    </View>
  );
}

function Days({ days, onChange, error }: { days: readonly Weekday[]; onChange: (days: Weekday[]) => void; error: string | undefined }) {
  return (
    <View className="gap-1.5" role="group" aria-label="Days of the week">
      <View className="flex-row flex-wrap gap-1.5">
        {weekdays.map((day) => {
          const on = days.includes(day);
          return (
            <Pressable
              key={day}
              role="checkbox"
              aria-checked={on}
              aria-label={weekdayWords[day]}
              testID={`day-${day}`}
              onPress={() => onChange(on ? days.filter((each) => each !== day) : [...days, day])}
              className={`min-h-target min-w-target flex-row items-center justify-center gap-1 rounded-action border px-2 ${on ? 'border-lamp bg-panel2' : 'border-line'}`}
            >
              {on ? <Icon name="tick" size={16} tone="lamp" /> : null}
              <Body size={13} strong={on} tone={on ? 'text' : 'dim'}>
                {weekdayWords[day]}
              </Body>
            </Pressable>
          );
        })}
      </View>
      {error === undefined ? null : (
        <Body role="alert" size={13} tone="danger">
          {error}
        </Body>
      )}
    </View>
  );
}

/** What the plan means on the calendar, changes of the clocks said. */
function NextStarts({ when, timeZone }: { when: When; timeZone: string }) {
  const plan = schedulePlanSchema.safeParse(planOf(when));
  if (!plan.success) return <Label>{plan.error.issues[0]?.message}</Label>;
  const next = occurrencesBetween(plan.data, timeZone, { afterUtcMs: serverNowMs(), untilUtcMs: Infinity, atMost: shownStarts });
  return (
    <View className="gap-1 rounded-panel border border-line p-3" role="status" testID="next-starts">
      <Label>
        {next.length === 0 ? 'No start lies ahead.' : next.length === 1 ? 'It starts' : 'The next starts'}
        {next.length === 0 ? '' : `, ${zoneName(timeZone)}:`}
      </Label>
      {next.map(({ dueUtcMs, remark }) => (
        <View key={dueUtcMs}>
          <Body>
            {dayWords(formatDay(dueUtcMs, timeZone))} {formatClock(dueUtcMs, { timeZone })}
          </Body>
          {remark === null ? null : (
            <Body size={13} tone="lamp">
              {remark}
            </Body>
          )}
        </View>
      ))}
    </View>
  );
}
