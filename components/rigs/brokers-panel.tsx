import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { labKey, serverNowMs, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Label, Panel, ProblemNotice } from '@/components/ui';
import { listBrokers, removeBroker, type BrokerStatus, type BrokerTopic, type BrokerView } from '@/shared/contracts/brokers';
import type { RigView } from '@/shared/contracts/rigs';
import { formatAgo } from '@/shared/lib/format-duration';
import { BrokerSheet } from './broker-sheet';

const ago = (iso: string) => formatAgo((serverNowMs() - Date.parse(iso)) / 1000);

/** The MQTT brokers that fill channels of this rig: whether they are heard, what came last, what was refused. */
export function BrokersPanel({ rig }: { rig: RigView }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const mayManage = useMay('tokens.manage').ok;
  const brokers = useLabQuery(listBrokers, { params: { rigId: rig.id }, everyMs: 5_000 });
  const refresh = () => void queries.invalidateQueries({ queryKey: labKey(labId, listBrokers) });
  /** The broker that is changed, or that another one is added. */
  const [asked, setAsked] = useState<BrokerView | 'another' | null>(null);
  const items = brokers.data?.data.items ?? [];
  if (items.length === 0 && !mayManage && !brokers.isError) return null;
  return (
    <Panel className="gap-3" testID="brokers">
      <Label>Sensors that speak MQTT send to a broker; the messages of its topics fill channels of this rig.</Label>
      {brokers.isError ? <ProblemNotice title="The brokers could not be read" {...wordsOf(brokers.error)} /> : null}
      {items.map((broker) => (
        <BrokerRow
          key={broker.id}
          rigId={rig.id}
          broker={broker}
          mayManage={mayManage}
          onDone={refresh}
          onChange={() => setAsked(broker)}
        />
      ))}
      {mayManage ? (
        <Button icon="plus" label="Listen to a broker" className="self-start" onPress={() => setAsked('another')} testID="add-broker" />
      ) : null}
      {asked === null ? null : (
        <BrokerSheet
          rigId={rig.id}
          broker={asked === 'another' ? null : asked}
          onClose={() => {
            refresh();
            setAsked(null);
          }}
        />
      )}
    </Panel>
  );
}

function stateWords(status: BrokerStatus | null): string {
  if (status === null) return 'no server listens yet; it begins within seconds';
  if (status.state === 'connected') return `connected ${ago(status.since)}`;
  if (status.state === 'connecting') return 'connecting';
  return `not connected, lost ${ago(status.since)}: ${status.reason ?? 'the reason is not known'}. It is tried again.`;
}

function BrokerRow(props: { rigId: string; broker: BrokerView; mayManage: boolean; onDone: () => void; onChange: () => void }) {
  const { rigId, broker, mayManage, onDone, onChange } = props;
  const [sure, setSure] = useState(false);
  const remove = useLabMutation(removeBroker, onDone);
  return (
    <View className="gap-2 border-t border-line pt-3" testID="broker">
      <View className="flex-row flex-wrap items-center justify-between gap-2">
        <View className="shrink">
          <Body strong className="break-all">
            {broker.address}
          </Body>
          <Label role="status" testID="broker-state">
            {stateWords(broker.status)}
          </Label>
        </View>
        {mayManage && !sure ? (
          <View className="flex-row flex-wrap">
            <Button
              kind="quiet"
              label="Change"
              accessibilityLabel={`Change how ${broker.address} is listened to`}
              onPress={onChange}
              testID="change-broker"
            />
            <Button
              kind="quiet"
              label="Remove"
              accessibilityLabel={`Listen no more to ${broker.address}`}
              onPress={() => setSure(true)}
              testID="remove-broker"
            />
          </View>
        ) : null}
      </View>
      {broker.topics.map((topic, index) => (
        <TopicFacts key={`${topic.filter} ${topic.channel.name}`} topic={topic} status={broker.status?.topics[index]} />
      ))}
      {sure ? (
        <View className="gap-2">
          <Body>Nothing more is taken from this broker; its name and password are forgotten. What it sent stays.</Body>
          <View className="flex-row flex-wrap gap-2">
            <Button
              kind="danger"
              label="Remove the broker"
              busy={remove.isPending}
              onPress={() => remove.mutate({ params: { rigId, brokerId: broker.id } })}
              testID="remove-broker-sure"
            />
            <Button kind="quiet" label="Keep it" onPress={() => setSure(false)} />
          </View>
        </View>
      ) : null}
      {remove.isError ? <ProblemNotice title="The broker is still listened to" {...wordsOf(remove.error)} /> : null}
    </View>
  );
}

function TopicFacts({ topic, status }: { topic: BrokerTopic; status: BrokerStatus['topics'][number] | undefined }) {
  const stamp = topic.time === null ? 'stamped as it arrives' : `stamped by ${topic.time.path}`;
  return (
    <View testID="broker-topic">
      <Body className="break-all">
        {topic.filter} fills {topic.channel.name}, {topic.channel.unit}
      </Body>
      <Label>
        {stamp}, u = {String(topic.timeUS)} s; {String(status?.taken ?? 0)} taken, {String(status?.refused ?? 0)} refused
      </Label>
      {status === undefined || status.last === null ? (
        <Label>No message from this topic yet.</Label>
      ) : (
        <Label className="break-all">
          Last message, {status.last.topic}, {ago(status.last.at)}: {status.last.payload}
        </Label>
      )}
      {status === undefined || status.lastRefused === null ? null : (
        <Label className="break-all" testID="broker-refused">
          Refused {ago(status.lastRefused.at)}: the message {status.lastRefused.topic === '' ? '' : `of ${status.lastRefused.topic} `}
          {status.lastRefused.reason}.
        </Label>
      )}
    </View>
  );
}
