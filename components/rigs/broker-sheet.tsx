import { useState } from 'react';
import { fieldErrors, useLabMutation, wordsOf } from '@/components/api';
import { Button, Field, Label, ProblemNotice, Sheet, Tabs } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';
import { addBroker } from '@/shared/contracts/brokers';
import type { RigView } from '@/shared/contracts/rigs';

const atOnce = {
  address: 'mqtt://',
  userName: '',
  password: '',
  filter: '',
  channel: 'box temperature',
  unit: 'degC',
  valuePath: '',
  timePath: '',
};
type TimeForm = 'arrival' | 'iso' | 's' | 'ms';

/** Adds a broker with one of its topics. */
export function BrokerSheet({ rig, onClose }: { rig: RigView; onClose: () => void }) {
  const [draft, setDraft] = useState(atOnce);
  const [role, setRole] = useState<'deflection' | 'environment'>('environment');
  const [form, setForm] = useState<TimeForm>('arrival');
  const [rate, setRate] = useState('0.1');
  const [stampU, setStampU] = useState('1');
  const add = useLabMutation(addBroker, onClose);
  const errors = fieldErrors(add.error);
  const [rateHz, timeUS] = [readDecimal(rate), readDecimal(stampU)];
  const complete = draft.filter.trim() !== '' && draft.channel.trim() !== '' && draft.unit.trim() !== '';
  const whole = complete && (form === 'arrival' || draft.timePath.trim() !== '') && (rateHz ?? 0) > 0 && (timeUS ?? 0) > 0;
  const set = (key: keyof typeof atOnce) => (text: string) => setDraft({ ...draft, [key]: text });
  const orNull = (text: string) => (text.trim() === '' ? null : text.trim());
  const send = () =>
    add.mutate({
      params: { rigId: rig.id },
      body: {
        address: draft.address.trim(),
        userName: orNull(draft.userName),
        password: draft.password === '' ? null : draft.password,
        topics: [
          {
            filter: draft.filter.trim(),
            channel: { name: draft.channel.trim(), role, unit: draft.unit.trim(), rateHz: rateHz ?? 0 },
            valuePath: orNull(draft.valuePath),
            time: form === 'arrival' ? null : { path: draft.timePath.trim(), form },
            timeUS: timeUS ?? 0,
          },
        ],
      },
    });
  const text = (key: keyof typeof atOnce, label: string, more: { hint?: string; error?: string | undefined } = {}) => (
    <Field label={label} value={draft[key]} onChange={set(key)} testID={`broker-${key}`} {...more} />
  );
  return (
    <Sheet
      open
      title="Listen to a broker"
      onClose={onClose}
      testID="broker-sheet"
      footer={
        <Button kind="primary" size="action" label="Listen" disabled={!whole} busy={add.isPending} onPress={send} testID="make-broker" />
      }
    >
      {text('address', 'Address', { hint: 'mqtt://host:1883, or mqtts://host:8883 with TLS.', error: errors['address'] })}
      {text('userName', 'Name at the broker', { hint: 'Empty where it asks for none.', error: errors['userName'] })}
      <Field label="Password" type="password" value={draft.password} onChange={set('password')} testID="broker-password" />
      <Label>The password goes to the broker and is never shown again. Without TLS it crosses the network readable.</Label>
      {text('filter', 'Topic', { hint: '+ stands for one level, # for all that follow.', error: errors['topics.0.filter'] })}
      <Tabs
        label="What it measures"
        value={role}
        options={[
          { value: 'environment', label: 'The room' },
          { value: 'deflection', label: 'Deflection' },
        ]}
        onChange={setRole}
      />
      {text('channel', 'Channel', { error: errors['topics.0.channel.name'] })}
      {text('unit', 'Unit', { error: errors['topics.0.channel.unit'] })}
      <Field label="Samples a second to expect" value={rate} onChange={setRate} type="number" unit="Hz" />
      {text('valuePath', 'Where the number is', {
        hint: 'In a JSON message, such as sensor.value or values[0]. Empty: the message is the number.',
        error: errors['topics.0.valuePath'],
      })}
      <Tabs
        label="Time of the measurement"
        value={form}
        options={[
          { value: 'arrival', label: 'On arrival' },
          { value: 'iso', label: 'ISO, UTC' },
          { value: 's', label: 'Epoch s' },
          { value: 'ms', label: 'Epoch ms' },
        ]}
        onChange={setForm}
      />
      {form === 'arrival' ? (
        <Label>What the broker kept from before is refused then: nobody knows when it was measured.</Label>
      ) : (
        text('timePath', 'Where the time is', { error: errors['topics.0.time.path'] })
      )}
      <Field
        label="Standard uncertainty of the time"
        value={stampU}
        onChange={setStampU}
        type="number"
        unit="s"
        error={errors['topics.0.timeUS']}
      />
      {add.isError ? <ProblemNotice title="The broker was not added" {...wordsOf(add.error)} /> : null}
    </Sheet>
  );
}
