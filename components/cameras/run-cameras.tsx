import { useState } from 'react';
import { serverNowMs, useLab } from '@/components/api';
import { Body, Label, Panel, Tabs } from '@/components/ui';
import { useNow } from '@/components/runs/use-now';
import type { CameraView } from '@/shared/contracts/cameras';
import { pictureWords, troubleWords } from './camera-words';
import { Picture } from './picture';
import { useCameras, usePictureAddress } from './use-cameras';

/** What a camera sees of the rig of a run that goes on, and when that was; nothing where the rig has none. */
export function RunCameras({ rigId }: { rigId: string }) {
  const items = useCameras(rigId).data?.data.items ?? [];
  const [chosen, setChosen] = useState<string | null>(null);
  const camera = items.find(({ id }) => id === chosen) ?? items[0];
  if (camera === undefined) return null;
  return (
    <Panel className="gap-2" testID="run-camera">
      {items.length === 1 ? (
        <Body strong>{camera.name}</Body>
      ) : (
        <Tabs label="Camera" value={camera.id} options={items.map(({ id, name }) => ({ value: id, label: name }))} onChange={setChosen} />
      )}
      <Newest rigId={rigId} camera={camera} />
    </Panel>
  );
}

function Newest({ rigId, camera }: { rigId: string; camera: CameraView }) {
  const { timeZone } = useLab();
  useNow(1000);
  const address = usePictureAddress(rigId)(camera);
  const words = pictureWords(camera, { timeZone, nowMs: serverNowMs() });
  const trouble = troubleWords(camera);
  return (
    <>
      {address === null ? null : <Picture address={address} words={`${camera.name}. ${words}`} testID="run-picture" />}
      <Label testID="run-picture-taken">{words}</Label>
      {trouble === null ? null : <Body tone="danger">{trouble}</Body>}
    </>
  );
}
