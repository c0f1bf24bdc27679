import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, useLabMutation, wordsOf } from '@/components/api';
import { SecretOnce } from '@/components/rigs/secret-once';
import { TryIt } from '@/components/rigs/try-it';
import { Button, Field, Label, ProblemNotice, Sheet, Tabs } from '@/components/ui';
import { addCamera, type CameraKind } from '@/shared/contracts/cameras';

interface CameraSheetProps {
  rigId: string;
  /** `name:port` of hosts that the server may ask. */
  hosts: readonly string[];
  /** Whether the rig is part of the server, so that it can be drawn. */
  simulated: boolean;
  onClose: () => void;
}

const ways: { value: CameraKind; label: string }[] = [
  { value: 'address', label: 'At an address' },
  { value: 'pushed', label: 'Sends pictures' },
];
const drawnWay = { value: 'drawn', label: 'Drawn' } as const;

/** Adds a camera of the network, one that sends its pictures, or the drawn one. */
export function CameraSheet({ rigId, hosts, simulated, onClose }: CameraSheetProps) {
  const [kind, setKind] = useState<CameraKind>('address');
  const [draft, setDraft] = useState({ name: '', address: 'http://', userName: '', password: '' });
  const add = useLabMutation(addCamera, ({ data }) => (data.secret === null ? onClose() : undefined));
  const errors = fieldErrors(add.error);
  const set = (key: keyof typeof draft) => (text: string) => setDraft({ ...draft, [key]: text });
  const name = draft.name.trim();
  const place = {
    address: draft.address.trim(),
    userName: draft.userName.trim() === '' ? null : draft.userName.trim(),
    password: draft.password === '' ? null : draft.password,
  };
  const send = () => add.mutate({ params: { rigId }, body: kind === 'address' ? { kind, name, ...place } : { kind, name } });
  const secret = add.data?.data.secret ?? null;
  if (secret !== null) return <Made secret={secret} name={name} onClose={onClose} />;
  return (
    <Sheet
      open
      title="Add a camera"
      onClose={onClose}
      testID="camera-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label={kind === 'address' ? 'Ask it for a picture and add it' : 'Add the camera'}
          disabled={name === ''}
          busy={add.isPending}
          onPress={send}
          testID="make-camera"
        />
      }
    >
      <Field
        label="Name"
        value={draft.name}
        onChange={set('name')}
        placeholder="Above the rig"
        error={errors['name']}
        testID="camera-name"
      />
      <Tabs
        label="How its pictures come"
        value={kind}
        options={simulated ? [...ways, drawnWay] : ways}
        onChange={setKind}
        testID="camera-kind"
      />
      {kind === 'address' ? <Place hosts={hosts} draft={draft} set={set} error={errors['address']} /> : null}
      {kind === 'pushed' ? (
        <Label>A browser or a program sends a JPEG or PNG of at most 1 MiB whenever it likes. It gets a token for that, shown once.</Label>
      ) : null}
      {kind === 'drawn' ? <Label>The simulated rig from above: turntable, masses and door as they truly stand.</Label> : null}
      {add.isError ? <ProblemNotice title="The camera was not added" {...wordsOf(add.error)} /> : null}
    </Sheet>
  );
}

interface PlaceProps {
  hosts: readonly string[];
  draft: { address: string; userName: string; password: string };
  set: (key: 'address' | 'userName' | 'password') => (text: string) => void;
  error: string | undefined;
}

function Place({ hosts, draft, set, error }: PlaceProps) {
  const allowed =
    hosts.length === 0
      ? 'The server may ask no host yet: whoever runs it names hosts in EVENFALL_CAMERA_HOSTS, such as camera.lab:80.'
      : `The server may ask ${hosts.join(', ')}. Whoever runs it names others in EVENFALL_CAMERA_HOSTS.`;
  return (
    <View className="gap-4">
      <Field
        label="Address of the picture or the MJPEG stream"
        value={draft.address}
        onChange={set('address')}
        hint="http://camera.lab:80/picture.jpg. Redirects are not followed."
        error={error}
        testID="camera-address"
      />
      <Label testID="camera-hosts">{allowed}</Label>
      <View className="gap-4 wide:flex-row">
        <View className="min-w-0 wide:flex-1">
          <Field label="Name at the camera" value={draft.userName} onChange={set('userName')} hint="Empty where it asks for none." />
        </View>
        <View className="min-w-0 wide:flex-1">
          <Field label="Password" type="password" value={draft.password} onChange={set('password')} testID="camera-password" />
        </View>
      </View>
      <Label>The password goes to the camera and is never shown again. Without TLS it crosses the network readable.</Label>
    </View>
  );
}

/** The one time that the token of a camera is seen. */
function Made({ secret, name, onClose }: { secret: string; name: string; onClose: () => void }) {
  return (
    <Sheet
      open
      mustAnswer
      title={`The token of ${name}`}
      onClose={onClose}
      testID="camera-made"
      footer={<Button kind="primary" size="action" label="I have copied it" onPress={onClose} testID="camera-copied" />}
    >
      <SecretOnce secret={secret} may="show pictures as this camera" testID="camera-secret" />
      <TryIt path="/api/camera-pictures" contentType="image/jpeg" data="@picture.jpg" />
      <Label>Send one every few seconds: a run takes the first one that was taken after a moment, within 10 s.</Label>
    </Sheet>
  );
}
