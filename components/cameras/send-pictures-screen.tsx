import { useLocalSearchParams } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { monotonicMs, useLabMutation, useMay, wordsOf } from '@/components/api';
import { CameraChoice, DeviceActs, DeviceScreen } from '@/components/spot/device-screen';
import { Warnings } from '@/components/spot/live-panel';
import { Body, Button, Field, Label, Panel, ProblemNotice, Section } from '@/components/ui';
import { addCamera } from '@/shared/contracts/cameras';
import { formatAgo } from '@/shared/lib/format-duration';
import { isToken } from '@/shared/spot/setting';
import { useKeptToken, usePictureSender, type SenderPage } from './use-picture-sender';

/** A camera of this device looks at the rig: its pictures are sent every few seconds, as long as the page is open. */
export function SendPicturesScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const [token, keep] = useKeptToken(rigId);
  const page = usePictureSender(rigId, token.trim());
  return (
    <DeviceScreen
      title="Send pictures"
      rigId={rigId}
      testID="send-pictures-screen"
      acts={<Acts page={page} hasToken={isToken(token)} />}
      aside={<TokenPanel rigId={rigId} token={token} onToken={keep} locked={page.view.sending} />}
    >
      <DeviceCamera page={page} />
    </DeviceScreen>
  );
}

function DeviceCamera({ page: { place, sender, view } }: { page: SenderPage }) {
  const { camera } = view;
  const isShown = camera.kind === 'open' || camera.kind === 'opening';
  return (
    <Section title="Camera" remark="Point it at the rig. Whoever is a member of the lab sees what it shows, people in the room too.">
      {camera.kind === 'refused' ? <ProblemNotice title="The camera was not opened" detail={camera.why} /> : null}
      {camera.kind === 'lost' ? <ProblemNotice title="The camera is away" detail={`${camera.why} It is looked for every 3 s.`} /> : null}
      <View className="w-full max-w-[640px]">
        <Video onVideo={place.set} shown={isShown} />
      </View>
      <Warnings warnings={view.warnings} />
      <CameraChoice
        state={camera.kind}
        chosen={camera.kind === 'open' ? camera.id : null}
        onOpen={(id) => void sender.openCamera(id)}
        onClose={() => sender.closeCamera()}
      />
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

function Acts({ page: { begin, end, view }, hasToken }: { page: SenderPage; hasToken: boolean }) {
  const missing = [view.camera.kind === 'open' ? null : 'open the camera', hasToken ? null : 'add it to the rig, or give its token'];
  return (
    <DeviceActs
      sending={view.sending}
      missing={missing.filter((one) => one !== null)}
      missingTestID="send-missing"
      begin={{ label: 'Send a picture every 3 s', onPress: begin, testID: 'send-begin' }}
      end={{ label: 'Send no more', onPress: end, testID: 'send-end' }}
    >
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
      ) : null}
    </DeviceActs>
  );
}
