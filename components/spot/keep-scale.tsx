import { useQueryClient } from '@tanstack/react-query';
import { labKey, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Label, ProblemNotice } from '@/components/ui';
import { addCalibration, listCalibrations } from '@/shared/contracts/calibrations';
import { listDevices } from '@/shared/contracts/devices';
import { calibrationOf, type SpotScale } from '@/shared/spot/scale';
import type { Calibration } from '@/shared/statistics/calibration';

const figures = ['offset', 'slope', 'uOffset', 'uSlope', 'covariance'] as const;
const isSame = (a: Calibration, b: Calibration) => figures.every((key) => Math.abs(a[key] - b[key]) <= 1e-9 * Math.abs(b[key]));

/** What the marks leave open belongs to the channel: evaluation and plots take it from there. */
export function KeepScale({ rigId, channel, scale, marks }: { rigId: string; channel: string; scale: SpotScale; marks: number }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const may = useMay('rig.edit').ok;
  const channelId = useLabQuery(listDevices, { params: { rigId } }).data?.data.channels.find((one) => one.channel.name === channel)?.channel
    .id;
  const known = useLabQuery(listCalibrations, { params: { rigId } });
  const add = useLabMutation(addCalibration, () => void queries.invalidateQueries({ queryKey: labKey(labId, listCalibrations) }));
  if (channelId === undefined || known.data === undefined) return null;
  const calibration = calibrationOf(scale);
  const last = known.data.data.items.find((item) => item.channelId === channelId);
  if (last !== undefined && isSame(last.calibration, calibration))
    return (
      <Label testID="scale-kept">
        {channel} keeps this u as revision {String(last.revision)} of its calibration.
      </Label>
    );
  if (!may) return <Label>A keeper of the lab can keep this u with the channel, on this page.</Label>;
  const note = `Scale of the light spot, ${String(marks)} marks`;
  return (
    <>
      <Body>
        {last === undefined ? 'The channel knows no u of its scale yet.' : 'The channel keeps the u of another scale.'} Runs that begin
        after it is kept take it.
      </Body>
      <Button
        label="Keep this u with the channel"
        className="self-start"
        busy={add.isPending}
        onPress={() => add.mutate({ params: { rigId }, body: { channelId, calibration, note } })}
        testID="keep-scale"
      />
      {add.isError ? <ProblemNotice title="The u was not kept" {...wordsOf(add.error)} /> : null}
    </>
  );
}
