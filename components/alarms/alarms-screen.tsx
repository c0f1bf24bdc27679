import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Empty, Label, Loading, Num, Panel, ProblemNotice, Screen, Section, Tabs } from '@/components/ui';
import { countAlarms, listAlarmHistory, listAlarms, type AlarmHistoryEntry, type AlarmView } from '@/shared/contracts/alarms';
import { zoneName } from '@/shared/lib/format-time';
import { AlarmRow } from './alarm-row';
import { byUrgency, factWords, isShown, placeOf, priorityWords, whenWords } from './alarm-words';

type View_ = 'now' | 'history';

/** The alarms that stand, those put aside, what happened, and how often each came. */
export function AlarmsScreen() {
  const { timeZone } = useLab();
  const [view, setView] = useState<View_>('now');
  return (
    <Screen title="Alarms" back={{ href: '/lab', label: 'the lab' }} testID="alarms-screen" aside={<Counts />}>
      <Tabs
        label="Alarms"
        value={view}
        options={[
          { value: 'now', label: 'Now' },
          { value: 'history', label: 'History' },
        ]}
        onChange={setView}
      />
      {view === 'now' ? <Now /> : <History />}
      <Label>Times are those of {zoneName(timeZone)}.</Label>
    </Screen>
  );
}

function Now() {
  const query = useLabQuery(listAlarms, { everyMs: 5000 });
  if (query.isError) return <ProblemNotice title="The alarms could not be read" {...wordsOf(query.error)} />;
  if (query.data === undefined) return <Loading label="Loading the alarms" />;
  const { items, serverAt } = query.data.data;
  const shown = items.filter(isShown);
  const aside = items.filter((alarm) => !isShown(alarm));
  return (
    <>
      {shown.length === 0 ? (
        <Empty title="No alarm stands" icon="passed">
          What needs a timely answer of somebody appears here and on every screen, and rings whoever is on call.
        </Empty>
      ) : (
        <Panel className="py-1" testID="standing-alarms">
          {grouped(shown).map(({ alarm, under }) => (
            <AlarmRow key={alarm.id} alarm={alarm} nowIso={serverAt} under={under} />
          ))}
        </Panel>
      )}
      {aside.length === 0 ? null : (
        <Section title="Put aside" remark="Shelved, suppressed while somebody works at the rig, or out of service: they tell nobody.">
          <Panel className="py-1">
            {aside.map((alarm) => (
              <AlarmRow key={alarm.id} alarm={alarm} nowIso={serverAt} />
            ))}
          </Panel>
        </Section>
      )}
    </>
  );
}

/** First causes by urgency, each followed by what follows from it. */
function grouped(alarms: readonly AlarmView[]): { alarm: AlarmView; under: boolean }[] {
  const ids = new Set(alarms.map(({ id }) => id));
  const isUnder = ({ causeId }: AlarmView) => causeId !== null && ids.has(causeId);
  return alarms
    .filter((alarm) => !isUnder(alarm))
    .sort(byUrgency)
    .flatMap((alarm) => [
      { alarm, under: false },
      ...alarms.filter(({ causeId }) => causeId === alarm.id).map((one) => ({ alarm: one, under: true })),
    ]);
}

function History() {
  const [cursors, setCursors] = useState<readonly (string | undefined)[]>([undefined]);
  return (
    <Panel className="py-1" testID="alarm-history">
      {cursors.map((cursor, index) => (
        <HistoryPage
          key={cursor ?? 'first'}
          cursor={cursor}
          onMore={index === cursors.length - 1 ? (next) => setCursors([...cursors, next]) : null}
        />
      ))}
    </Panel>
  );
}

function HistoryPage({ cursor, onMore }: { cursor: string | undefined; onMore: ((next: string) => void) | null }) {
  const query = useLabQuery(listAlarmHistory, {
    query: cursor === undefined ? {} : { cursor },
    everyMs: cursor === undefined ? 10_000 : 0,
  });
  if (query.isError) return <ProblemNotice title="The history could not be read" {...wordsOf(query.error)} />;
  if (query.data === undefined) return <Loading label="Loading the history" />;
  const { items, next } = query.data.data;
  if (items.length === 0) return <Body className="py-4">Nothing has happened yet.</Body>;
  return (
    <>
      {items.map((entry) => (
        <HistoryRow key={entry.seq} entry={entry} />
      ))}
      {next === null || onMore === null ? null : <Button kind="quiet" label="Earlier" onPress={() => onMore(next)} />}
    </>
  );
}

export function HistoryRow({ entry, short = false }: { entry: AlarmHistoryEntry; short?: boolean }) {
  const { timeZone } = useLab();
  const what = factWords[entry.fact] ?? entry.fact;
  return (
    <View className="flex-row gap-3 border-b border-line py-2 last:border-b-0">
      <Num size={13} tone="dim" className="w-[76px] pt-0.5">
        {whenWords(entry.at, { timeZone, nowIso: entry.at })}
      </Num>
      <View className="min-w-0 flex-1">
        <Body>
          {short ? what : `${what}: ${entry.title}`}
          {entry.by === '' ? '' : `, by ${entry.by}`}
        </Body>
        <Label>
          {short ? '' : `${whenWords(entry.at, { timeZone, nowIso: '2000-01-01T00:00:00Z' }).slice(0, 10)}, ${placeOf(entry)}`}
          {entry.words === '' ? '' : `${short ? '' : ': '}${entry.words}`}
        </Label>
      </View>
    </View>
  );
}

function Counts() {
  const query = useLabQuery(countAlarms);
  const data = query.data?.data;
  if (data === undefined) return null;
  const total = data.items.reduce((sum, { count }) => sum + count, 0);
  return (
    <Section title={`Last ${data.days} days`} remark="One in ten minutes is what a person can heed; most should be of low priority.">
      <Panel className="gap-1">
        {data.items.length === 0 ? <Body tone="dim">No alarm was raised.</Body> : null}
        {data.items.map(({ code, title, priority, count }) => (
          <View key={code} className="flex-row items-center gap-3 py-1">
            <Body className="min-w-0 flex-1">{title}</Body>
            <Label>{priorityWords[priority].toLowerCase()}</Label>
            <Num>{count}</Num>
          </View>
        ))}
        {total === 0 ? null : <Label>{total} in all</Label>}
      </Panel>
    </Section>
  );
}
