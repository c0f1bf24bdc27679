import type { ReactNode } from 'react';
import type { Href } from 'expo-router';
import { View } from 'react-native';
import { useRig } from '@/components/rigs/use-rig';
import { Body, Button, Screen, Select } from '@/components/ui';
import { useDeviceCameras } from './use-device-cameras';

/** What the pages share on which a camera of this device works for a rig as long as they are open. */

interface DeviceScreenProps {
  title: string;
  rigId: string;
  testID: string;
  acts: ReactNode;
  aside: ReactNode;
  children: ReactNode;
}

/** The frame of such a page: the rig to go back to, the acts within the thumb's reach. */
export function DeviceScreen({ title, rigId, testID, acts, aside, children }: DeviceScreenProps) {
  const rig = useRig(rigId).data?.data;
  return (
    <Screen
      title={title}
      back={{ href: `/rigs/${rigId}` as Href, label: rig?.name ?? 'the rig' }}
      testID={testID}
      footer={acts}
      footerGivesWay
      aside={aside}
    >
      {children}
    </Screen>
  );
}

interface Act {
  label: string;
  onPress: () => void;
  testID: string;
}

interface DeviceActsProps {
  sending: boolean;
  /** What has to be done before it can begin, each as an order: `open the camera`. */
  missing: readonly string[];
  missingTestID: string;
  begin: Act;
  end: Act;
  /** Above the button: how it goes. */
  children?: ReactNode;
  /** Beside the button. */
  beside?: ReactNode;
}

/** Begins and ends the work of the page; until then it says what is still to do. */
export function DeviceActs({ sending, missing, missingTestID, begin, end, children, beside }: DeviceActsProps) {
  return (
    <View className="gap-2">
      {children}
      {sending || missing.length === 0 ? null : (
        <Body tone="dim" size={13} testID={missingTestID}>
          Still to do: {missing.join('; ')}.
        </Body>
      )}
      <View className="flex-row gap-3">
        {sending ? (
          <Button size="action" className="flex-1" {...end} />
        ) : (
          <Button kind="primary" size="action" className="flex-1" disabled={missing.length > 0} {...begin} />
        )}
        {beside}
      </View>
    </View>
  );
}

interface CameraChoiceProps {
  /** Looked for anew whenever it changes: names are told only once a camera was allowed. */
  state: 'closed' | 'opening' | 'open' | 'lost' | 'refused';
  /** The camera that is open or was; null where none was. */
  chosen: string | null;
  /** Another may not be chosen, nor this one closed. */
  locked?: boolean;
  onOpen: (id: string | null) => void;
  onClose: () => void;
}

/** Which camera of the device, and opening and closing it. */
export function CameraChoice({ state, chosen, locked = false, onOpen, onClose }: CameraChoiceProps) {
  const cameras = useDeviceCameras(state);
  return (
    <View className="flex-row flex-wrap items-end gap-3">
      {cameras.length === 0 ? null : (
        <View className="min-w-[220px] flex-1">
          <Select
            label="Which camera"
            value={chosen ?? ''}
            options={optionsOf(cameras, chosen)}
            onChange={(id) => onOpen(id === '' ? null : id)}
            disabled={locked}
            testID="which-camera"
          />
        </View>
      )}
      {state === 'open' || state === 'lost' ? (
        <Button label="Close the camera" disabled={locked} onPress={onClose} testID="close-camera" />
      ) : (
        <Button kind="primary" label="Open the camera" busy={state === 'opening'} onPress={() => onOpen(chosen)} testID="open-camera" />
      )}
    </View>
  );
}

/** The cameras to choose from, with the one that was read before, though it may be away. */
function optionsOf(cameras: readonly { id: string; name: string }[], chosen: string | null) {
  const options = cameras.map(({ id, name }) => ({ value: id, label: name }));
  if (chosen === null) return [{ value: '', label: 'Any' }, ...options];
  return options.some(({ value }) => value === chosen)
    ? options
    : [{ value: chosen, label: 'The one of before, which is away' }, ...options];
}
