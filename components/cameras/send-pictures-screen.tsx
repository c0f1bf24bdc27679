import { useLocalSearchParams, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { monotonicMs, useLabMutation, useMay, wordsOf } from '@/components/api';
import { useRig } from '@/components/rigs/use-rig';
import { useDeviceCameras } from '@/components/spot/use-device-cameras';
import { Body, Button, Field, Label, Panel, ProblemNotice, Screen, Section, Select } from '@/components/ui';
import { addCamera } from '@/shared/contracts/cameras';
import { formatAgo } from '@/shared/lib/format-duration';
import { isToken } from '@/shared/spot/setting';
import { useKeptToken, usePictureSender, type SenderPage } from './use-picture-sender';

/** A camera of this device looks at the rig: its pictures are sent every few seconds, as long as the page is open. */
export function SendPicturesScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const rig = useRig(rigId).data?.data;
  const [token, keep] = useKeptToken(rigId);
  const page = usePictureSender(token.trim());
  return (
    <Screen
      title="Send pictures"
      back={{ href: `/rigs/${rigId}` as Href, label: rig?.name ?? 'the rig' }}
      testID="send-pictures-screen"
      footer={<Acts page={page} hasToken={isToken(token)} />}
      footerGivesWay
      aside={<TokenPanel rigId={rigId} token={token} onToken={keep} locked={page.view.sending} />}
    >
      <DeviceCamera page={page} />
    </Screen>
  );
}

function DeviceCamera({ page: { place, sender, view } }: { page: SenderPage }) {
  const { camera } = view;
  const cameras = useDeviceCameras(camera.kind);
  const isShown = camera.kind === 'open' || camera.kind === 'opening';
  const known = cameras.map(({ id, name }) => ({ value: id, label: name }));
  return (
    <Section title="Camera" remark="Point it at the rig. Whoever is a member of the lab sees what it shows, people in the room too.">
      {camera.kind === 'refused' ? <ProblemNotice title="The camera was not opened" detail={camera.why} /> : null}
      {camera.kind === 'lost' ? <ProblemNotice title="The camera is away" detail={`${camera.why} It is looked for every 3 s.`} /> : null}
      <View className="w-full max-w-[640px]">
        <Video onVideo={place.set} shown={isShown} />
      </View>
      <View className="flex-row flex-wrap items-end gap-3">
        {known.length === 0 ? null : (
          <View className="min-w-[220px] flex-1">
            <Select
              label="Which camera"
              value={camera.kind === 'open' ? camera.id : ''}
              options={camera.kind === 'open' ? known : [{ value: '', label: 'Any' }, ...known]}
              onChange={(id) => void sender.openCamera(id === '' ? null : id)}
              testID="send-camera"
            />
          </View>
        )}
        {isShown ? (
          <Button label="Close the camera" onPress={() => sender.closeCamera()} testID="send-close" />
        ) : (
          <Button kind="primary" label="Open the camera" onPress={() => void sender.openCamera(null)} testID="send-open" />
        )}
      </View>
    </Section>
  );
}

function Video({ onVideo, shown }: { onVideo: (element: HTMLVideoElement | null) => void; shown: boolean }) {
  return (
    <video ref={onVideo} muted playsInline aria-hidden style={{ display: shown ? 'block' : 'none', width: '100%', borderRadius: 8 }} />
  );
}

function TokenPanel(props: { rigId: string; token: string; onToken: (token: string) => void; locked: boolean }) {
  const { rigId, token, onToken, locked } = props;
  const mayManage = useMay('tokens.manage').ok;
  const [name, setName] = useState('');
  const make = useLabMutation(addCamera, ({ data }) => onToken(data.secret ?? ''));
  return (
    <Section title="What it is to the rig">
      <Panel className="gap-4">
        {token !== '' || !mayManage ? null : (
          <>
            <Field label="Name of the camera" value={name} onChange={setName} placeholder="By the window" testID="send-name" />
            <Button
              label="Add it to the rig"
              className="self-start"
              disabled={name.trim() === ''}
              busy={make.isPending}
              onPress={() => make.mutate({ params: { rigId }, body: { kind: 'pushed', name: name.trim() } })}
              testID="send-make"
            />
            {make.isError ? <ProblemNotice title="The camera was not added" {...wordsOf(make.error)} /> : null}
            <Label>Or paste the token of one that was added before.</Label>
          </>
        )}
        {token === '' && !mayManage ? <Body>An owner of the lab adds the camera on the page of the rig; paste its token here.</Body> : null}
        <Field
          label="Token of the camera"
          type="password"
          autoComplete="off"
          value={token}
          onChange={onToken}
          disabled={locked}
          error={token === '' || isToken(token) ? undefined : 'A token has at least 20 characters and no space in it.'}
          hint="It can show pictures as this camera and do nothing else, and is kept on this device. Removing the camera ends it."
          testID="send-token"
        />
      </Panel>
    </Section>
  );
}

function Acts({ page: { sender, view }, hasToken }: { page: SenderPage; hasToken: boolean }) {
  const missing = [view.camera.kind === 'open' ? null : 'open the camera', hasToken ? null : 'add it to the rig, or give its token'];
  const todo = missing.filter((one) => one !== null);
  return (
    <View className="gap-2">
      {view.trouble === null ? null : (
        <Body tone="danger" role="status" testID="send-trouble">
          {view.trouble}
        </Body>
      )}
      {view.sending ? (
        <Body testID="send-state">
          {view.sentAtMs === null
            ? 'The first picture is on its way.'
            : `${String(view.sent)} sent, the last ${formatAgo((monotonicMs() - view.sentAtMs) / 1000)}. Leave this page open.`}
        </Body>
      ) : todo.length > 0 ? (
        <Body tone="dim" testID="send-missing">
          Still to do: {todo.join('; ')}.
        </Body>
      ) : null}
      {view.sending ? (
        <Button kind="plain" size="action" label="Send no more" onPress={() => sender.end()} testID="send-end" />
      ) : (
        <Button
          kind="primary"
          size="action"
          label="Send a picture every 3 s"
          disabled={todo.length > 0}
          onPress={() => sender.begin()}
          testID="send-begin"
        />
      )}
    </View>
  );
}
