import { useEffect } from 'react';
import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Icon, Label, Panel, ProblemNotice, Section } from '@/components/ui';
import { formatClock } from '@/shared/lib/format-time';
import { isSamePicture, usualRegion, type SpotSetting } from '@/shared/spot/setting';
import { CameraChoice } from './device-screen';
import { PictureView } from './picture-view';
import type { CameraState } from './spot-reader';
import type { SpotPage } from './use-spot-reader';

/** The camera and its picture; the region is drawn in it. */
export function CameraPanel({ page, linePx, onLine }: { page: SpotPage; linePx: number | null; onLine: (px: number) => void }) {
  const { reader, view, setting, change, place } = page;
  const { picture, spot } = view;
  const isOpen = view.camera.kind === 'open' || view.camera.kind === 'lost';
  useEffect(() => {
    if (view.camera.kind === 'open' && view.camera.id !== setting.cameraId) change(nowKnownAs(view.camera, setting));
    if (picture !== null && setting.region === null) change({ region: usualRegion(picture), picture });
  });
  const marksFit = setting.picture === null || (picture !== null && isSamePicture(setting.picture, picture));
  const open = (id: string | null) => {
    change({ cameraId: id });
    void reader.openCamera(id);
  };
  return (
    <Section title="Camera">
      <CameraNotice camera={view.camera} />
      <PictureView
        onVideo={place.set}
        open={isOpen || view.camera.kind === 'opening'}
        picture={isOpen ? picture : null}
        region={setting.region}
        spotPx={spot?.px ?? null}
        linePx={linePx}
        onRegion={(region) => change({ region, picture, ...(marksFit ? {} : { marks: [] }) })}
        onLine={onLine}
      />
      <CameraChoice
        state={view.camera.kind}
        chosen={setting.cameraId}
        locked={view.sending}
        onOpen={open}
        onClose={() => reader.closeCamera()}
      />
      {view.camera.kind === 'open' && view.camera.free.length > 0 ? (
        <Label>
          The camera goes on setting by itself: {view.camera.free.join(', ')}. Set it by hand in its own program: each change moves the spot
          or its brightness.
        </Label>
      ) : null}
    </Section>
  );
}

/** What was marked in its picture stays marked where the browser only gave the camera another id. */
function nowKnownAs({ id, name, before }: CameraState & { kind: 'open' }, { picture }: SpotSetting): Partial<SpotSetting> {
  const marked = picture !== null && before !== null && picture.cameraId === before ? { picture: { ...picture, cameraId: id } } : {};
  return { cameraId: id, cameraName: name, ...marked };
}

function CameraNotice({ camera }: { camera: CameraState }) {
  const { timeZone } = useLab();
  if (camera.kind === 'refused') return <ProblemNotice title="The camera was not opened" detail={camera.why} />;
  if (camera.kind !== 'lost') return null;
  return (
    <Panel edge="danger" testID="camera-lost">
      <View role="alert" className="flex-row gap-2">
        <Icon name="warning" tone="danger" />
        <Body className="flex-1">
          The camera is away since {formatClock(camera.sinceUtcMs, { timeZone, precision: 'seconds' })}. {camera.why} It is looked for every
          3 s, and nothing is stored meanwhile; what was read until then is sent.
        </Body>
      </View>
    </Panel>
  );
}
