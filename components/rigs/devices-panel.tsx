import { useQueryClient } from '@tanstack/react-query';
import { useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { labKey, serverNowMs, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Label, Panel, ProblemNotice, Section } from '@/components/ui';
import { listDevices, revokeDeviceToken, type DeviceTokenView } from '@/shared/contracts/devices';
import type { ResponseOf } from '@/shared/contracts/route';
import type { RigView } from '@/shared/contracts/rigs';
import { formatAgo } from '@/shared/lib/format-duration';
import { formatSignificant } from '@/shared/lib/format-number';
import { formatDay, formatDayAndClock } from '@/shared/lib/format-time';
import { BrokersPanel } from './brokers-panel';
import { DeviceSheet } from './device-sheet';

type Devices = ResponseOf<typeof listDevices>;

/** What sends samples to this rig as it measures: the channels that devices fill, and the tokens they sign with. */
export function DevicesPanel({ rig }: { rig: RigView }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const router = useRouter();
  const mayManage = useMay('tokens.manage').ok;
  const devices = useLabQuery(listDevices, { params: { rigId: rig.id }, everyMs: 10_000 });
  const refresh = () => void queries.invalidateQueries({ queryKey: labKey(labId, listDevices) });
  const [making, setMaking] = useState(false);
  return (
    <Section title="Live data">
      <Panel className="gap-3" testID="devices">
        <Label>
          A camera tracker or a sensor board sends its samples over HTTP as it measures. Conditions of a run, start checks and alarms look
          at them at once.
        </Label>
        {devices.isError ? <ProblemNotice title="The devices could not be read" {...wordsOf(devices.error)} /> : null}
        {devices.data === undefined ? null : <Channels channels={devices.data.data.channels} />}
        {(devices.data?.data.tokens ?? [])
          .filter(({ revokedAt }) => revokedAt === null)
          .map((token) => (
            <TokenRow key={token.id} rigId={rig.id} token={token} mayManage={mayManage} onDone={refresh} />
          ))}
        <MayNote act="tokens.manage" />
        {mayManage ? (
          <Button icon="plus" label="Add a device" className="self-start" onPress={() => setMaking(true)} testID="add-device" />
        ) : null}
        <Button
          label="Read the light spot with this device"
          className="self-start"
          onPress={() => router.push(`/rigs/${rig.id}/light-spot` as Href)}
          testID="to-light-spot"
        />
      </Panel>
      <BrokersPanel rig={rig} />
      {making ? (
        <DeviceSheet
          rig={rig}
          onClose={() => {
            refresh();
            setMaking(false);
          }}
        />
      ) : null}
    </Section>
  );
}

function Channels({ channels }: { channels: Devices['channels'] }) {
  const { timeZone } = useLab();
  if (channels.length === 0) return <Body tone="dim">No device fills a channel of this rig yet.</Body>;
  return (
    <View className="gap-2">
      {channels.map(({ channel, lastSampleAt, thinnedToAt }) => (
        <View key={channel.id}>
          <Body strong>
            {channel.name}, {channel.unit}
          </Body>
          <Label>
            {channel.rateHz === null ? '' : `${formatSignificant(channel.rateHz, 3)} Hz expected, `}
            {lastSampleAt === null ? 'no sample yet' : `last sample ${formatAgo((serverNowMs() - Date.parse(lastSampleAt)) / 1000)}`}
          </Label>
          {thinnedToAt === null ? null : (
            <Label>Full rate from {formatDay(Date.parse(thinnedToAt), timeZone)} on and within runs; before, summaries of 2 s.</Label>
          )}
        </View>
      ))}
    </View>
  );
}

function TokenRow(props: { rigId: string; token: DeviceTokenView; mayManage: boolean; onDone: () => void }) {
  const { rigId, token, mayManage, onDone } = props;
  const { timeZone } = useLab();
  const [sure, setSure] = useState(false);
  const revoke = useLabMutation(revokeDeviceToken, onDone);
  const day = (iso: string) => formatDayAndClock(Date.parse(iso), timeZone);
  return (
    <View className="gap-2 border-t border-line pt-3" testID="device-token">
      <View className="flex-row flex-wrap items-center justify-between gap-2">
        <View className="shrink">
          <Body strong>{token.name}</Body>
          <Label>
            fills {token.channels.join(', ')}; token by {token.madeBy}, {day(token.madeAt)};{' '}
            {token.lastUsedAt === null ? 'never used' : `last used ${day(token.lastUsedAt)}`}
          </Label>
        </View>
        {mayManage && !sure ? (
          <Button
            kind="quiet"
            label="Revoke"
            accessibilityLabel={`Revoke the token of ${token.name}`}
            onPress={() => setSure(true)}
            testID="revoke-device"
          />
        ) : null}
      </View>
      {sure ? (
        <View className="gap-2">
          <Body>Nothing more is taken from {token.name}. What it sent stays; a new token makes it welcome again.</Body>
          <View className="flex-row flex-wrap gap-2">
            <Button
              kind="danger"
              label="Revoke the token"
              busy={revoke.isPending}
              onPress={() => revoke.mutate({ params: { rigId, tokenId: token.id } })}
              testID="revoke-sure"
            />
            <Button kind="quiet" label="Keep it" onPress={() => setSure(false)} />
          </View>
        </View>
      ) : null}
      {revoke.isError ? <ProblemNotice title="The token still counts" {...wordsOf(revoke.error)} /> : null}
    </View>
  );
}
