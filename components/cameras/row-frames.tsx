import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Label } from '@/components/ui';
import type { FrameView } from '@/shared/contracts/cameras';
import { frameWords } from './camera-words';
import { Picture } from './picture';
import { useFrameAddress } from './use-cameras';

/** What cameras saw at the moments of a row of the step log; nothing where none were asked. */
export function RowFrames({ runId, frames }: { runId: string; frames: readonly FrameView[] }) {
  const { timeZone } = useLab();
  if (frames.length === 0) return null;
  return (
    <View className="gap-3 wide:flex-row wide:flex-wrap" testID="row-frames">
      {frames.map((frame) => (
        <View key={frame.id} className="gap-1 wide:w-[300px]" testID="frame">
          <FramePicture runId={runId} frame={frame} testID="frame-picture" />
          <Label>{frameWords(frame, timeZone)}</Label>
        </View>
      ))}
    </View>
  );
}

/** The picture of a frame, or why there is none. */
export function FramePicture({ runId, frame, testID }: { runId: string; frame: FrameView; testID: string }) {
  const { timeZone } = useLab();
  const address = useFrameAddress(runId)(frame);
  if (frame.picture === null) return <Body tone="dim">No picture: {frame.note ?? 'the reason is not known'}.</Body>;
  return <Picture address={address} words={frameWords(frame, timeZone)} testID={testID} />;
}
