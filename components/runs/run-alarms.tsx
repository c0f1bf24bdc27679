import { Link, type Href } from 'expo-router';
import { View } from 'react-native';
import { priorityWords, runAlarmFacts, whenWords } from '@/components/alarms/alarm-words';
import { useLab, useLabQuery, wordsOf } from '@/components/api';
import { Body, Icon, Label, Num, Panel, ProblemNotice, Section } from '@/components/ui';
import { listRunAlarms, type RunAlarm } from '@/shared/contracts/alarms';

/** Alarms of a run: what, when, until when, whom it was told and who saw it. A rehearsal has none, and says nothing. */
export function RunAlarms({ runId, startedAt, rehearsal }: { runId: string; startedAt: string | null; rehearsal: boolean }) {
  const query = useLabQuery(listRunAlarms, { params: { runId }, enabled: !rehearsal });
  if (rehearsal) return null;
  if (query.isError) return <ProblemNotice title="The alarms of the run could not be read" {...wordsOf(query.error)} />;
  const items = query.data?.data.items;
  if (items === undefined) return null;
  return (
    <Section title="Alarms" {...(items.length === 0 ? {} : { remark: 'Of this run, its rig and the lab while it went on.' })}>
      <Panel className="py-1" testID="run-alarms">
        {items.length === 0 ? <Body className="py-2">No alarm was raised.</Body> : null}
        {items.map((alarm) => (
          <Row key={`${alarm.alarmId} ${alarm.occurrence}`} alarm={alarm} nowIso={startedAt ?? alarm.raisedAt} />
        ))}
      </Panel>
    </Section>
  );
}

function Row({ alarm, nowIso }: { alarm: RunAlarm; nowIso: string }) {
  const { timeZone } = useLab();
  const when = (iso: string) => whenWords(iso, { timeZone, nowIso });
  const { title, priority, words, cause, consequence, raisedAt, seen, aside } = alarm;
  const unheeded = seen === null && aside === null;
  return (
    <Link
      href={`/alarms/${alarm.alarmId}` as Href}
      className="min-h-target flex-row gap-3 border-b border-line py-2 last:border-b-0 hover:bg-panel2"
      style={{ display: 'flex', flexDirection: 'row' }}
      testID="run-alarm"
    >
      <Icon name={unheeded ? 'warning' : 'note'} size={22} tone={unheeded && priority === 'high' ? 'danger' : 'lamp'} />
      <View className="min-w-0 flex-1">
        <View className="flex-row flex-wrap items-baseline justify-between gap-x-3">
          <Body strong className="shrink">
            {title}
          </Body>
          <Num size={13} tone="dim">
            {when(raisedAt)}
          </Num>
        </View>
        <Body size={15}>{words === '' ? cause : words}</Body>
        <Label>{consequence}</Label>
        <Label>
          {priorityWords[priority]} priority; {runAlarmFacts(alarm, when).join('; ')}.
        </Label>
      </View>
    </Link>
  );
}
