import { useState } from 'react';
import { fieldErrors, useLabMutation, wordsOf } from '@/components/api';
import { Button, Field, Label, ProblemNotice, Sheet, Tabs } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';
import { makeDeviceToken, type StreamChannel } from '@/shared/contracts/devices';
import type { RigView } from '@/shared/contracts/rigs';
import { SecretOnce } from './secret-once';
import { TryIt } from './try-it';

/** Makes a token for a device: what it measures, how often; the token is shown once, with a line to try it. */
export function DeviceSheet({ rig, onClose }: { rig: RigView; onClose: () => void }) {
  const [name, setName] = useState('');
  const [channel, setChannel] = useState<StreamChannel>({ name: 'deflection', role: 'deflection', unit: 'urad', rateHz: 10 });
  const [rate, setRate] = useState('10');
  const make = useLabMutation(makeDeviceToken);
  const made = make.data?.data;
  const rateHz = readDecimal(rate);
  const errors = fieldErrors(make.error);
  const send = () =>
    make.mutate({ params: { rigId: rig.id }, body: { name: name.trim(), channels: [{ ...channel, rateHz: rateHz ?? 0 }] } });
  if (made !== undefined) return <Made secret={made.secret} name={made.token.name} channel={channel} onClose={onClose} />;
  return (
    <Sheet
      open
      title="Add a device"
      onClose={onClose}
      testID="device-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label="Make its token"
          disabled={name.trim() === '' || channel.name.trim() === '' || channel.unit.trim() === '' || rateHz === null || rateHz <= 0}
          busy={make.isPending}
          onPress={send}
          testID="make-device"
        />
      }
    >
      <Field label="Device" value={name} onChange={setName} placeholder="Camera tracker" error={errors['name']} testID="device-name" />
      <Tabs
        label="What it measures"
        value={channel.role}
        options={[
          { value: 'deflection', label: 'Deflection' },
          { value: 'environment', label: 'The room' },
        ]}
        onChange={(role) => {
          const deflection = role === 'deflection';
          setChannel({
            ...channel,
            role,
            ...(deflection ? { name: 'deflection', unit: 'urad' } : { name: 'box temperature', unit: 'degC' }),
          });
          setRate(deflection ? '10' : '1');
        }}
      />
      <Field
        label="Channel"
        value={channel.name}
        onChange={(text) => setChannel({ ...channel, name: text })}
        hint="Protocols name it in waits and in what makes a dwell good."
        error={errors['channels.0.name']}
        testID="device-channel"
      />
      {channel.role === 'deflection' ? (
        <Tabs
          label="Unit"
          value={channel.unit}
          options={['rad', 'mrad', 'urad', 'm', 'mm'].map((unit) => ({ value: unit, label: unit === 'urad' ? 'µrad' : unit }))}
          onChange={(unit) => setChannel({ ...channel, unit })}
        />
      ) : (
        <Field
          label="Unit"
          value={channel.unit}
          onChange={(unit) => setChannel({ ...channel, unit })}
          error={errors['channels.0.unit']}
          testID="device-unit"
        />
      )}
      <Field
        label="Samples a second to expect"
        value={rate}
        onChange={setRate}
        type="number"
        unit="Hz"
        error={errors['channels.0.rateHz']}
      />
      {make.isError ? <ProblemNotice title="No token was made" {...wordsOf(make.error)} /> : null}
    </Sheet>
  );
}

/** The one time that the token is seen. */
function Made({ secret, name, channel, onClose }: { secret: string; name: string; channel: StreamChannel; onClose: () => void }) {
  const line = `{"channel": "${channel.name}", "time_utc": "2031-02-14T20:00:00.1Z", "value": 12.3}`;
  return (
    <Sheet
      open
      mustAnswer
      title={`The token of ${name}`}
      onClose={onClose}
      testID="device-made"
      footer={<Button kind="primary" size="action" label="I have copied it" onPress={onClose} testID="device-copied" />}
    >
      <SecretOnce secret={secret} may="fill this channel" testID="device-secret" />
      <TryIt path="/api/samples" contentType="application/x-ndjson" data={`'${line}'`} />
      <Label>
        One line for each sample, in UTC with Z. What is sent again is stored once; a line that is wrong is named and nothing is stored.
      </Label>
    </Sheet>
  );
}
