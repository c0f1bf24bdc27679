import { useLocalSearchParams } from 'expo-router';
import { useState } from 'react';
import { Button } from '@/components/ui';
import { fitScale } from '@/shared/spot/scale';
import { isSamePicture, isToken, regionFault } from '@/shared/spot/setting';
import { BlackScreen } from './black-screen';
import { CameraPanel } from './camera-panel';
import { DeviceActs, DeviceScreen } from './device-screen';
import { LivePanel } from './live-panel';
import { ReadingPanel } from './reading-panel';
import { ScalePanel } from './scale-panel';
import { TargetPanel } from './target-panel';
import { useSpotReader, type SpotPage } from './use-spot-reader';

/** Reads the light spot on the scale with a camera of this device, all night, into a channel of the rig. */
export function SpotScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const page = useSpotReader(rigId);
  const [linePx, setLinePx] = useState<number | null>(null);
  const [black, setBlack] = useState(false);
  return (
    <DeviceScreen
      title="Read the light spot"
      rigId={rigId}
      testID="spot-screen"
      acts={<Acts page={page} onBlack={() => setBlack(true)} />}
      aside={
        <>
          <ReadingPanel page={page} />
          <ScalePanel page={page} rigId={rigId} linePx={linePx} />
          <TargetPanel page={page} rigId={rigId} />
        </>
      }
    >
      <CameraPanel page={page} linePx={linePx} onLine={setLinePx} />
      <LivePanel view={page.view} channel={page.setting.channel} />
      {black ? <BlackScreen view={page.view} onClose={() => setBlack(false)} /> : null}
    </DeviceScreen>
  );
}

/** What still has to be done before samples can be kept. */
function stillToDo({ view, setting }: SpotPage): string[] {
  const { picture } = view;
  const same = picture === null || setting.picture === null || isSamePicture(picture, setting.picture);
  return [
    view.camera.kind === 'open' ? null : 'open the camera',
    same ? null : 'draw the region and mark the scale anew, because camera or picture size is another one than they belong to',
    setting.region !== null && picture !== null && regionFault(setting.region, picture) !== null
      ? 'draw the region within the picture'
      : null,
    fitScale(setting.marks, setting.uMarkMm) === null ? 'mark two places of the scale' : null,
    setting.channel === '' ? 'choose the channel' : null,
    !isToken(setting.token) ? 'give the token of the device' : null,
  ].filter((one) => one !== null);
}

function Acts({ page, onBlack }: { page: SpotPage; onBlack: () => void }) {
  const { view } = page;
  return (
    <DeviceActs
      sending={view.sending}
      missing={stillToDo(page)}
      missingTestID="spot-missing"
      begin={{ label: 'Begin to read', onPress: page.begin, testID: 'begin-reading' }}
      end={{ label: 'End the reading', onPress: page.end, testID: 'end-reading' }}
      beside={<Button size="action" label="Black screen" className="flex-1" onPress={onBlack} testID="go-black" />}
    />
  );
}
