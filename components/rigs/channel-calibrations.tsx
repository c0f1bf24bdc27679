import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { labKey, useLab, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Label, Panel, ProblemNotice, Section } from '@/components/ui';
import { listCalibrations, type CalibrationView } from '@/shared/contracts/calibrations';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { CalibrationSheet } from './calibration-sheet';
import { calibrationWords } from './calibration-words';

/** What the readings of channels truly say: every revision, the newest of each channel first. */
export function ChannelCalibrations({ rigId }: { rigId: string }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const list = useLabQuery(listCalibrations, { params: { rigId } });
  const mayEdit = useMay('rig.edit');
  const [adding, setAdding] = useState(false);
  const items = list.data?.data.items ?? [];
  return (
    <Section
      title="Calibrations of channels"
      trailing={
        mayEdit.ok ? <Button kind="quiet" icon="plus" label="Add" onPress={() => setAdding(true)} testID="add-calibration" /> : undefined
      }
    >
      <Panel className="gap-1 py-2" testID="channel-calibrations">
        {list.isError ? <ProblemNotice title="The calibrations could not be read" {...wordsOf(list.error)} /> : null}
        {list.data !== undefined && items.length === 0 ? (
          <Body tone="dim">None: readings count as they are sent, and no u of a calibration is known.</Body>
        ) : null}
        {items.map((item) => (
          <Revision key={`${item.channelId} ${String(item.revision)}`} item={item} />
        ))}
      </Panel>
      {adding ? (
        <CalibrationSheet
          rigId={rigId}
          onClose={() => {
            void queries.invalidateQueries({ queryKey: labKey(labId, listCalibrations) });
            setAdding(false);
          }}
        />
      ) : null}
    </Section>
  );
}

function Revision({ item }: { item: CalibrationView }) {
  const { timeZone } = useLab();
  const { channelName, revision, calibration, unit, validFrom, note, madeBy } = item;
  return (
    <View className="border-b border-line py-1 last:border-b-0" testID="calibration">
      <Body>
        {channelName}, revision {String(revision)}: {calibrationWords(calibration, unit)}
      </Body>
      <Label>
        for runs from {formatDayAndClock(Date.parse(validFrom), timeZone)} on; {note}; by {madeBy}
      </Label>
    </View>
  );
}
