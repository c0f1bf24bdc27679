import { useQueryClient } from '@tanstack/react-query';
import { Link, useLocalSearchParams, type Href } from 'expo-router';
import { useState, type ReactNode } from 'react';
import { View } from 'react-native';
import { labKey, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Icon, Label, Loading, Num, Panel, ProblemNotice, Screen, Section } from '@/components/ui';
import * as contracts from '@/shared/contracts/alarms';
import type { AlarmHopView, AlarmView } from '@/shared/contracts/alarms';
import { formatClockWithZone } from '@/shared/lib/format-time';
import { HistoryRow } from './alarms-screen';
import { hopGroups, isUnacknowledged, markOf, placeOf, priorityWords, ringsWords, stateWords, whenWords } from './alarm-words';
import { ReasonSheet, type ReasonKind } from './reason-sheet';

/** One alarm: what was found, what it means, what to do; the acts; what happened and who was told. */
export function AlarmScreen() {
  const { alarmId } = useLocalSearchParams<{ alarmId: string }>();
  const query = useLabQuery(contracts.getAlarm, { params: { alarmId }, everyMs: 5000 });
  const back = { href: '/alarms' as Href, label: 'the alarms' };
  if (query.data === undefined)
    return (
      <Screen title="Alarm" back={back}>
        {query.isError ? <ProblemNotice title="The alarm could not be read" {...wordsOf(query.error)} /> : <Loading />}
      </Screen>
    );
  const { alarm, history, hops } = query.data.data;
  return (
    <Screen
      title={alarm.title}
      back={back}
      testID="alarm-screen"
      footer={<Acts alarm={alarm} />}
      aside={
        <>
          <Told hops={hops} />
          <Section title="What happened">
            <Panel className="py-1">
              {history.map((entry) => (
                <HistoryRow key={entry.seq} entry={entry} short />
              ))}
            </Panel>
          </Section>
        </>
      }
    >
      <State alarm={alarm} />
      <Panel className="gap-3">
        <Fact label="Found">{alarm.words === '' ? alarm.cause : alarm.words}</Fact>
        <Fact label="What it means">{alarm.consequence}</Fact>
        <Fact label="What to do">{alarm.answer}</Fact>
        <Fact label="Whom it tells">{ringsWords[alarm.rings]}</Fact>
        {alarm.runId === null ? null : (
          <Link
            href={`/runs/${alarm.runId}` as Href}
            className="min-h-target flex-row items-center gap-2"
            style={{ display: 'flex', flexDirection: 'row' }}
          >
            <Body tone="lamp" strong>
              To the run
            </Body>
            <Icon name="forward" size={16} tone="lamp" />
          </Link>
        )}
      </Panel>
      <Aside alarm={alarm} />
    </Screen>
  );
}

function Fact({ label, children }: { label: string; children: ReactNode }) {
  return (
    <View>
      <Label>{label}</Label>
      <Body>{children}</Body>
    </View>
  );
}

function State({ alarm }: { alarm: AlarmView }) {
  const { timeZone } = useLab();
  const mark = markOf(alarm);
  const urgent = isUnacknowledged(alarm);
  return (
    <View
      role="status"
      className={`flex-row items-center gap-4 rounded-panel border-2 bg-panel p-4 ${urgent ? 'ef-alarm border-danger' : 'border-line'}`}
    >
      <Icon name={mark.icon} size={32} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
      <View className="min-w-0 flex-1" testID="alarm-state">
        <Body size={17} strong>
          {placeOf(alarm)}: {stateWords[alarm.state]}
        </Body>
        <Label>
          {priorityWords[alarm.priority]} priority
          {alarm.raisedAt === null
            ? ''
            : `, raised ${formatClockWithZone(Date.parse(alarm.raisedAt), { timeZone, precision: 'seconds', weekday: true })}`}
          {alarm.acknowledged === null ? '' : `; acknowledged by ${alarm.acknowledged.by}`}
          {alarm.confirmed === null
            ? ''
            : `; done by ${alarm.confirmed.by}${alarm.confirmed.note === '' ? '' : `: ${alarm.confirmed.note}`}`}
          {alarm.shelf === null
            ? ''
            : `; shelved by ${alarm.shelf.by} until ${formatClockWithZone(Date.parse(alarm.shelf.until), { timeZone, weekday: true })}: ${alarm.shelf.reason}`}
          {alarm.suppressedWhy === null ? '' : `; ${alarm.suppressedWhy}`}
          {alarm.outOfService === null ? '' : `; ${alarm.outOfService.by}: ${alarm.outOfService.reason}`}
        </Label>
      </View>
    </View>
  );
}

const useRefresh = () => {
  const { labId } = useLab();
  const queries = useQueryClient();
  return () => {
    for (const route of [contracts.listAlarms, contracts.getAlarm, contracts.listAlarmHistory])
      void queries.invalidateQueries({ queryKey: labKey(labId, route) });
  };
};

/** What can be done now, within the thumb's reach: seen it, done it, cleared the latch. Three acts, never one button. */
function Acts({ alarm }: { alarm: AlarmView }) {
  const refresh = useRefresh();
  const mayAcknowledge = useMay('alarm.acknowledge');
  const mayReset = useMay('alarm.shelve');
  const acknowledge = useLabMutation(contracts.acknowledgeAlarm, refresh);
  const reset = useLabMutation(contracts.resetAlarm, refresh);
  const [confirming, setConfirming] = useState(false);
  const params = { alarmId: alarm.id };
  const error = acknowledge.error ?? reset.error;
  const mayConfirm = alarm.acknowledged !== null && alarm.confirmed === null;
  return (
    <View className="gap-2">
      {error === null ? null : <ProblemNotice title="Nothing was changed" {...wordsOf(error)} />}
      {mayAcknowledge.ok ? null : <Label>{mayAcknowledge.why}</Label>}
      <View className="flex-row flex-wrap gap-3">
        {isUnacknowledged(alarm) && mayAcknowledge.ok ? (
          <Button
            kind="primary"
            size="action"
            className="grow"
            icon="tick"
            label="Acknowledge"
            busy={acknowledge.isPending}
            onPress={() => acknowledge.mutate({ params })}
            testID="acknowledge"
          />
        ) : null}
        {mayConfirm && mayAcknowledge.ok ? (
          <Button size="action" className="grow" label="It is done" onPress={() => setConfirming(true)} testID="confirm-done" />
        ) : null}
        {alarm.state === 'latched' && mayReset.ok ? (
          <Button
            size="action"
            className="grow"
            label="Reset"
            busy={reset.isPending}
            onPress={() => reset.mutate({ params })}
            testID="reset"
          />
        ) : null}
      </View>
      {isUnacknowledged(alarm) && mayAcknowledge.ok ? <Label>You have seen it and take care: nobody else is rung.</Label> : null}
      {confirming ? <ReasonSheet kind="confirm" alarm={alarm} onClose={() => setConfirming(false)} onDone={refresh} /> : null}
    </View>
  );
}

/** Putting an alarm aside: on a shelf for a time, or out of service until somebody returns it. */
function Aside({ alarm }: { alarm: AlarmView }) {
  const refresh = useRefresh();
  const mayShelve = useMay('alarm.shelve');
  const mayTakeOut = useMay('rig.edit');
  const unshelve = useLabMutation(contracts.unshelveAlarm, refresh);
  const putBack = useLabMutation(contracts.returnAlarm, refresh);
  const [asking, setAsking] = useState<ReasonKind | null>(null);
  const params = { alarmId: alarm.id };
  const error = unshelve.error ?? putBack.error;
  return (
    <Section title="Put aside">
      <View className="flex-row flex-wrap gap-2">
        {alarm.shelf !== null && mayShelve.ok ? (
          <Button label="Back from the shelf" busy={unshelve.isPending} onPress={() => unshelve.mutate({ params })} testID="unshelve" />
        ) : null}
        {alarm.shelf === null && mayShelve.ok ? (
          <Button label="Shelve for a time" onPress={() => setAsking('shelve')} testID="shelve" />
        ) : null}
        {alarm.outOfService !== null && mayTakeOut.ok ? (
          <Button label="Return to service" busy={putBack.isPending} onPress={() => putBack.mutate({ params })} testID="return-alarm" />
        ) : null}
        {alarm.outOfService === null && mayTakeOut.ok ? (
          <Button kind="quiet" label="Take out of service" onPress={() => setAsking('take-out')} testID="take-out" />
        ) : null}
      </View>
      {mayShelve.ok ? null : <Label>{mayShelve.why}</Label>}
      {error === null ? null : <ProblemNotice title="Nothing was changed" {...wordsOf(error)} />}
      {asking === null ? null : <ReasonSheet kind={asking} alarm={alarm} onClose={() => setAsking(null)} onDone={refresh} />}
    </Section>
  );
}

function Told({ hops }: { hops: readonly AlarmHopView[] }) {
  const { timeZone } = useLab();
  return (
    <Section title="Who was told">
      <Panel className="py-1" testID="hops">
        {hops.length === 0 ? <Body className="py-2">Nobody so far.</Body> : null}
        {hopGroups(hops).map(({ seq, at, name, words, details }) => (
          <View key={seq} className="flex-row gap-3 border-b border-line py-2 last:border-b-0">
            <Num size={13} tone="dim" className="w-[76px] pt-0.5">
              {whenWords(at, { timeZone, nowIso: at })}
            </Num>
            <View className="min-w-0 flex-1">
              <Body>
                {name}: {words}
              </Body>
              {details === '' ? null : <Label className="break-words">{details}</Label>}
            </View>
          </View>
        ))}
      </Panel>
    </Section>
  );
}
