import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { labKey, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Field, Label, Panel, ProblemNotice, Section, Select } from '@/components/ui';
import { listDevices, makeDeviceToken } from '@/shared/contracts/devices';
import { isToken } from '@/shared/spot/setting';
import type { SpotPage } from './use-spot-reader';

/** The unit that the reader measures in. */
const unit = 'mm';

/** Where samples go: a channel of the rig, with the token of a device that may fill it. */
export function TargetPanel({ page, rigId }: { page: SpotPage; rigId: string }) {
  const { setting, change, view } = page;
  const devices = useLabQuery(listDevices, { params: { rigId }, everyMs: 30_000 });
  const channels = (devices.data?.data.channels ?? [])
    .map(({ channel }) => channel)
    .filter((channel) => channel.role === 'deflection' && channel.unit === unit);
  const names = [...new Set([...channels.map(({ name }) => name), ...(setting.channel === '' ? [] : [setting.channel])])];
  return (
    <Section title="Where it goes" remark="Samples are millimetres on the scale; the lever of the rig makes angles of them.">
      <Panel className="gap-4" testID="spot-target">
        {devices.isError ? <ProblemNotice title="The channels could not be read" {...wordsOf(devices.error)} /> : null}
        {setting.token === '' ? <MakeToken page={page} rigId={rigId} /> : null}
        {names.length === 0 ? null : (
          <Select
            label="Channel"
            value={setting.channel}
            options={[{ value: '', label: 'Choose a channel in mm' }, ...names.map((name) => ({ value: name, label: name }))]}
            onChange={(channel) => change({ channel })}
            disabled={view.sending}
            testID="spot-channel"
          />
        )}
        <Field
          label="Device token"
          type="password"
          autoComplete="off"
          value={setting.token}
          onChange={(token) => change({ token })}
          error={
            setting.token === '' || isToken(setting.token) ? undefined : 'A device token has at least 20 characters and no space in it.'
          }
          hint="It can fill the channel and do nothing else, and is kept on this device. An owner makes it, here or on the page of the rig, and can revoke it there."
          testID="spot-token"
        />
      </Panel>
    </Section>
  );
}

function MakeToken({ page, rigId }: { page: SpotPage; rigId: string }) {
  const mayManage = useMay('tokens.manage').ok;
  const [name, setName] = useState(page.setting.channel === '' ? 'light spot' : page.setting.channel);
  const rateHz = Math.max(1, Math.round(page.view.figures.rateHz));
  const { labId } = useLab();
  const queries = useQueryClient();
  const make = useLabMutation(makeDeviceToken, ({ data }) => {
    page.change({ token: data.secret, channel: name.trim() });
    void queries.invalidateQueries({ queryKey: labKey(labId, listDevices) });
  });
  if (!mayManage) return <Body>An owner of the lab makes a device token for the reader; paste it here.</Body>;
  const body = {
    name: 'Light-spot reader',
    channels: [{ name: name.trim(), role: 'deflection' as const, unit, rateHz: page.view.figures.rateHz > 0 ? rateHz : 10 }],
  };
  return (
    <>
      <Field label="Channel to fill" value={name} onChange={setName} testID="spot-channel-name" />
      <Button
        label="Make a token for this device"
        className="self-start"
        disabled={name.trim() === ''}
        busy={make.isPending}
        onPress={() => make.mutate({ params: { rigId }, body })}
        testID="spot-make-token"
      />
      {make.isError ? <ProblemNotice title="No token was made" {...wordsOf(make.error)} /> : null}
      <Label>Or paste one that was made before.</Label>
    </>
  );
}
