import { useEffect, useState } from 'react';
import { View } from 'react-native';
import { useLab } from '@/components/api';
import { camerasOf, frameAt } from '@/components/cameras/frame-at';
import { frameWords } from '@/components/cameras/camera-words';
import { FramePicture } from '@/components/cameras/row-frames';
import { useFrameAddress } from '@/components/cameras/use-cameras';
import { Body, Label, Panel, Tabs } from '@/components/ui';
import type { FrameView } from '@/shared/contracts/cameras';
import { formatDuration } from '@/shared/lib/format-duration';

interface ReplayCameraProps {
  runId: string;
  frames: readonly FrameView[];
  atUtcMs: number;
}

/** Pictures that are loaded ahead of the moment, so that none is missing when it comes. */
const ahead = 4;

/** What a camera had seen last at a moment of the run, in step with the rest. */
export function ReplayCamera({ runId, frames, atUtcMs }: ReplayCameraProps) {
  const { timeZone } = useLab();
  const names = camerasOf(frames);
  const [chosen, setChosen] = useState<string | null>(null);
  const name = names.find((one) => one === chosen) ?? names[0];
  const frame = name === undefined ? null : frameAt(frames, name, atUtcMs);
  useAhead(runId, name === undefined ? [] : frames.filter(({ camera }) => camera === name), frame);
  if (name === undefined) return null;
  return (
    <Panel className="gap-2 wide:flex-1" testID="replay-camera">
      {names.length === 1 ? null : (
        <Tabs label="Camera" value={name} options={names.map((value) => ({ value, label: value }))} onChange={setChosen} />
      )}
      {frame === null ? (
        <Label>{name} has no frame yet at this moment.</Label>
      ) : (
        <View className="flex-row items-center gap-4 wide:flex-col wide:items-start wide:gap-2">
          <View className="w-[168px] wide:w-[264px]">
            <FramePicture runId={runId} frame={frame} testID="replay-picture" />
          </View>
          <View className="min-w-0 shrink gap-1">
            <Body testID="replay-frame">{frameWords(frame, timeZone)}</Body>
            <Label testID="replay-frame-age">{agoWords((atUtcMs - Date.parse(frame.at)) / 1000)}</Label>
          </View>
        </View>
      )}
    </Panel>
  );
}

/** To the second in the first minute, then to the minute: figures that run are of no use. */
const agoWords = (seconds: number) =>
  seconds < 2
    ? 'at this moment'
    : `${formatDuration(seconds < 60 ? Math.floor(seconds) : 60 * Math.floor(seconds / 60))} before this moment`;

function useAhead(runId: string, own: readonly FrameView[], frame: FrameView | null): void {
  const address = useFrameAddress(runId);
  const from = frame === null ? 0 : own.indexOf(frame) + 1;
  const next = own
    .slice(from, from + ahead)
    .filter(({ picture }) => picture !== null)
    .map(address)
    .join(' ');
  useEffect(() => {
    for (const one of next === '' ? [] : next.split(' ')) new Image().src = one;
  }, [next]);
}
