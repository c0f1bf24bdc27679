import { useQueryClient } from '@tanstack/react-query';
import { useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { labKey, serverNowMs, useLab, useLabMutation, useMay, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Label, Panel, ProblemNotice, Section } from '@/components/ui';
import { listCameras, removeCamera, type CameraView } from '@/shared/contracts/cameras';
import type { RigView } from '@/shared/contracts/rigs';
import { CameraSheet } from './camera-sheet';
import { kindWords, pictureWords, troubleWords } from './camera-words';
import { Picture } from './picture';
import { useCameras, usePictureAddress } from './use-cameras';

/** The cameras that look at a rig: what they see, what failed, and how one comes and goes. */
export function CamerasPanel({ rig }: { rig: RigView }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const router = useRouter();
  const mayManage = useMay('tokens.manage').ok;
  const cameras = useCameras(rig.id);
  const refresh = () => void queries.invalidateQueries({ queryKey: labKey(labId, listCameras) });
  const [adding, setAdding] = useState(false);
  const found = cameras.data?.data;
  return (
    <Section title="Cameras">
      <Panel className="gap-3" testID="cameras">
        <Label>Each run keeps what they see at both ends of every swing and at marks that ask for a frame.</Label>
        {cameras.isError ? <ProblemNotice title="The cameras could not be read" {...wordsOf(cameras.error)} /> : null}
        {found?.items.length === 0 ? <Body tone="dim">No camera looks at this rig yet.</Body> : null}
        {found?.items.map((camera) => (
          <CameraRow key={camera.id} rigId={rig.id} camera={camera} mayManage={mayManage} onDone={refresh} />
        ))}
        <MayNote act="tokens.manage" />
        {mayManage && found !== undefined ? (
          <Button icon="plus" label="Add a camera" className="self-start" onPress={() => setAdding(true)} testID="add-camera" />
        ) : null}
        <Button
          label="Send pictures with this device"
          className="self-start"
          onPress={() => router.push(`/rigs/${rig.id}/send-pictures` as Href)}
          testID="to-send-pictures"
        />
      </Panel>
      {adding && found !== undefined ? (
        <CameraSheet
          rigId={rig.id}
          hosts={found.hosts}
          simulated={found.simulated}
          onClose={() => {
            refresh();
            setAdding(false);
          }}
        />
      ) : null}
    </Section>
  );
}

function CameraRow(props: { rigId: string; camera: CameraView; mayManage: boolean; onDone: () => void }) {
  const { rigId, camera, mayManage, onDone } = props;
  const { timeZone } = useLab();
  const [sure, setSure] = useState(false);
  const remove = useLabMutation(removeCamera, onDone);
  const address = usePictureAddress(rigId)(camera);
  const words = pictureWords(camera, { timeZone, nowMs: serverNowMs() });
  const trouble = troubleWords(camera);
  return (
    <View className="gap-2 border-t border-line pt-3" testID="camera">
      <View className="flex-row flex-wrap items-center justify-between gap-2">
        <View className="min-w-0 shrink">
          <Body strong>{camera.name}</Body>
          <Label className="break-all">{camera.address ?? kindWords[camera.kind]}</Label>
        </View>
        {mayManage && !sure ? (
          <Button
            kind="quiet"
            label="Remove"
            accessibilityLabel={`Remove the camera ${camera.name}`}
            onPress={() => setSure(true)}
            testID="remove-camera"
          />
        ) : null}
      </View>
      {address === null ? null : <Picture address={address} words={`${camera.name}. ${words}`} testID="camera-picture" />}
      <Label testID="camera-taken">{words}</Label>
      {trouble === null ? null : (
        <Body tone="danger" role="status" testID="camera-trouble">
          {trouble}
        </Body>
      )}
      {sure ? (
        <View className="gap-2">
          <Body>It is asked for no more pictures; its name, password and token are forgotten. Frames stay with their runs.</Body>
          <View className="flex-row flex-wrap gap-2">
            <Button
              kind="danger"
              label="Remove the camera"
              busy={remove.isPending}
              onPress={() => remove.mutate({ params: { rigId, cameraId: camera.id } })}
              testID="remove-camera-sure"
            />
            <Button kind="quiet" label="Keep it" onPress={() => setSure(false)} />
          </View>
        </View>
      ) : null}
      {remove.isError ? <ProblemNotice title="The camera is still there" {...wordsOf(remove.error)} /> : null}
    </View>
  );
}
