import { useState } from 'react';
import { View } from 'react-native';
import { serverNowMs, useLab, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Empty, IconButton, Label, Loading, ProblemNotice, Screen, Section, Tabs } from '@/components/ui';
import { readCalendar, type CalendarItem } from '@/shared/contracts/schedules';
import { zoneName } from '@/shared/lib/format-time';
import { CalendarProgram } from './calendar-program';
import { RoomHoursList } from './room-hours';
import { NightHours, NightRow, StartRow } from './night-view';
import { byDay, dayAfter, dayWords, mondayOf, nightDayOf, nightsFrom } from './nights';
import { ScheduleList } from './schedule-list';
import { ScheduleSheet } from './schedule-sheet';
import { StartSheet } from './start-sheet';

const everyMs = 30_000;
const views = [
  { value: 'list', label: 'List' },
  { value: 'week', label: 'Week' },
  { value: 'day', label: 'Day' },
] as const;
type View_ = (typeof views)[number]['value'];
const lengths: Record<View_, number> = { list: 28, week: 7, day: 1 };

/** What will start by itself, and what became of what should have: as a list, as the nights of a week, or one night rig by rig. */
export function CalendarScreen() {
  const { timeZone } = useLab();
  const mayPlan = useMay('run.start');
  const nowUtcMs = serverNowMs();
  const tonight = nightDayOf(nowUtcMs, timeZone);
  const [view, setView] = useState<View_>('list');
  const [chosenDay, setChosenDay] = useState<string | null>(null);
  const [opened, setOpened] = useState<CalendarItem | null>(null);
  const [planning, setPlanning] = useState(false);
  const day = chosenDay ?? tonight;
  const first = view === 'week' ? mondayOf(day) : day;
  const nights = nightsFrom(first, lengths[view], timeZone);
  const [from, until] = [nights[0]?.fromUtcMs ?? 0, nights.at(-1)?.untilUtcMs ?? 0].map((ms) => new Date(ms).toISOString());
  const query = useLabQuery(readCalendar, { query: { from: from ?? '', until: until ?? '' }, everyMs });
  const items = query.data?.data.items ?? [];
  const shown = { items, nowUtcMs, timeZone, onOpen: setOpened };
  return (
    <Screen
      title="Calendar"
      testID="calendar-screen"
      aside={
        <>
          <ScheduleList />
          <RoomHoursList />
          <CalendarProgram />
        </>
      }
    >
      {mayPlan.ok ? (
        <Button kind="primary" size="action" icon="plus" label="Schedule a run" onPress={() => setPlanning(true)} testID="schedule-a-run" />
      ) : (
        <Label>{mayPlan.why}</Label>
      )}
      <Tabs label="View" value={view} options={views} onChange={setView} testID="calendar-view" />
      <View className="flex-row items-center gap-2">
        <IconButton icon="back" label="Earlier" onPress={() => setChosenDay(dayAfter(day, -lengths[view]))} testID="earlier" />
        <View className="min-w-0 flex-1 items-center">
          <Body strong>
            {view === 'day' ? `Night of ${dayWords(first)}` : `${dayWords(first)} to ${dayWords(dayAfter(first, lengths[view] - 1))}`}
          </Body>
          <Label>{zoneName(timeZone)}</Label>
        </View>
        {chosenDay === null ? null : <Button kind="quiet" label="Today" onPress={() => setChosenDay(null)} />}
        <IconButton icon="forward" label="Later" onPress={() => setChosenDay(dayAfter(day, lengths[view]))} testID="later" />
      </View>
      {query.isPending ? <Loading label="Loading the calendar" /> : null}
      {query.isError && items.length === 0 ? (
        <ProblemNotice
          title="The calendar could not be loaded"
          detail={wordsOf(query.error).detail}
          action={{ label: 'Try again', onPress: () => void query.refetch() }}
        />
      ) : null}
      {query.isSuccess && view === 'list' ? <ListView {...shown} /> : null}
      {query.isSuccess && view === 'week' ? (
        <View className="gap-1.5" testID="week-view">
          <NightHours />
          {nights.map((night) => (
            <NightRow key={night.day} label={dayWords(night.day)} night={night} {...shown} />
          ))}
          <Label>Each row goes from noon to noon.</Label>
        </View>
      ) : null}
      {query.isSuccess && view === 'day' && nights[0] !== undefined ? (
        <View className="gap-1.5" testID="day-view">
          <NightHours />
          {[...new Set(items.map(({ rigName }) => rigName))].map((rigName) => (
            <NightRow
              key={rigName}
              label={rigName}
              night={nights[0] as (typeof nights)[number]}
              {...shown}
              items={items.filter((item) => item.rigName === rigName)}
            />
          ))}
          {items.length === 0 ? <Label>Nothing is scheduled for this night.</Label> : null}
        </View>
      ) : null}
      {planning ? <ScheduleSheet onClose={() => setPlanning(false)} /> : null}
      {opened === null ? null : <StartSheet item={opened} onClose={() => setOpened(null)} />}
    </Screen>
  );
}

interface ListProps {
  items: readonly CalendarItem[];
  timeZone: string;
  onOpen: (item: CalendarItem) => void;
}

function ListView({ items, timeZone, onOpen }: ListProps) {
  if (items.length === 0)
    return (
      <Empty title="Nothing is scheduled" icon="calendar">
        A schedule starts an issued protocol at a time of day in the zone of the lab, once or on days of the week. It never arms: somebody
        is at the rig before.
      </Empty>
    );
  return byDay(items, timeZone).map(({ day, items: ofDay }) => (
    <Section key={day} title={dayWords(day)}>
      <View>
        {ofDay.map((item, index) => (
          <StartRow
            key={`${item.scheduleId} ${item.dueAt}`}
            item={item}
            timeZone={timeZone}
            onOpen={onOpen}
            last={index === ofDay.length - 1}
          />
        ))}
      </View>
    </Section>
  ));
}
