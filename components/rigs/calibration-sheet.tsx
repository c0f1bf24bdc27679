import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, useLabMutation, useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Field, IconButton, Label, ProblemNotice, Select, Sheet, Tabs } from '@/components/ui';
import { addCalibration } from '@/shared/contracts/calibrations';
import { listChannels } from '@/shared/contracts/data';
import { formatSignificant, unitSign } from '@/shared/lib/format-number';
import { calibrationOfDraft, fitOf, freshCalibration, withPoint, type CalibrationDraft } from './calibration-draft';
import { calibrationWords } from './calibration-words';

interface PartProps {
  draft: CalibrationDraft;
  change: (part: Partial<CalibrationDraft>) => void;
  unit: string;
}

/** Another revision of what the readings of a channel truly say. */
export function CalibrationSheet({ rigId, onClose }: { rigId: string; onClose: () => void }) {
  const channels = useLabQuery(listChannels, { params: { rigId } }).data?.data.items ?? [];
  const [chosen, setChosen] = useState('');
  const [draft, setDraft] = useState(freshCalibration);
  const add = useLabMutation(addCalibration, onClose);
  const change = (part: Partial<CalibrationDraft>) => {
    setDraft({ ...draft, ...part });
    if (add.isError) add.reset();
  };
  const channelId = chosen === '' ? (channels[0]?.id ?? '') : chosen;
  const unit = unitSign(channels.find(({ id }) => id === channelId)?.unit ?? '');
  const calibration = calibrationOfDraft(draft);
  const errors = fieldErrors(add.error);
  const send = () =>
    calibration === null ? undefined : add.mutate({ params: { rigId }, body: { channelId, calibration, note: draft.note.trim() } });
  return (
    <Sheet
      open
      title="Calibrate a channel"
      onClose={onClose}
      testID="calibration-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label="It holds from now on"
          disabled={calibration === null || channelId === '' || draft.note.trim() === ''}
          busy={add.isPending}
          onPress={send}
          testID="calibration-save"
        />
      }
    >
      {channels.length === 0 ? (
        <Body>The rig has no channel yet: it gets one with its first samples.</Body>
      ) : (
        <Select
          label="Channel"
          value={channelId}
          options={channels.map(({ id, name }) => ({ value: id, label: name }))}
          onChange={setChosen}
          testID="calibration-channel"
        />
      )}
      <Tabs
        label="How it is known"
        value={draft.by}
        options={[
          { value: 'comparison', label: 'By comparison' },
          { value: 'figures', label: 'By its figures' },
        ]}
        onChange={(by) => change({ by })}
        testID="calibration-by"
      />
      {draft.by === 'comparison' ? <Comparison {...{ draft, change, unit }} /> : <Figures {...{ draft, change, unit }} />}
      {calibration === null ? null : <Body testID="calibration-line">Value = {calibrationWords(calibration, unit)}</Body>}
      <Field
        label="Where it comes from"
        value={draft.note}
        onChange={(note) => change({ note })}
        placeholder="Certificate 31-07 of the thermometer"
        error={errors['note']}
        testID="calibration-note"
      />
      <Label>
        Samples stay as they were sent. Evaluations, plots and archives of runs that begin from now on take it; what was evaluated before
        stays. Limits and what makes a dwell good go by readings as sent.
      </Label>
      {add.isError ? <ProblemNotice title="Nothing was changed" {...wordsOf(add.error)} /> : null}
    </Sheet>
  );
}

function Comparison({ draft, change, unit }: PartProps) {
  const { points } = draft;
  const fit = fitOf(draft);
  const set = (index: number, part: Partial<CalibrationDraft['points'][number]>) =>
    change({ points: points.map((point, i) => (i === index ? { ...point, ...part } : point)) });
  return (
    <View className="gap-4">
      {points.map((point, index) => (
        <View key={index} className="gap-1" testID="calibration-point">
          <View className="flex-row items-end gap-2">
            <View className="min-w-0 flex-1">
              <Field
                label={`${String(index + 1)}: it read`}
                value={point.reading}
                type="number"
                unit={unit}
                onChange={(reading) => set(index, { reading })}
              />
            </View>
            <View className="min-w-0 flex-1">
              <Field
                label="the standard said"
                value={point.standard}
                type="number"
                unit={unit}
                onChange={(standard) => set(index, { standard })}
              />
            </View>
            {points.length <= 2 ? null : (
              <IconButton
                icon="remove"
                label={`Take point ${String(index + 1)} away`}
                onPress={() => change({ points: points.filter((_, i) => i !== index) })}
              />
            )}
          </View>
          {fit === null || fit.scatterMm === null ? null : (
            <Label>
              off the line by {formatSignificant(fit.residualsMm[index] ?? 0, 2, { signed: true })} {unit}
            </Label>
          )}
        </View>
      ))}
      <Button icon="plus" label="Another point" className="self-start" onPress={() => change(withPoint(draft))} testID="calibration-add" />
      <Field
        label="Standard uncertainty of what the standard said"
        value={draft.uStandard}
        type="number"
        unit={unit}
        onChange={(uStandard) => change({ uStandard })}
        hint="Where the points scatter more about their line than that, the scatter counts."
        testID="calibration-u"
      />
    </View>
  );
}

const figures = [
  { key: 'offset', label: 'Offset', hasUnit: true, hint: 'Value = offset + slope · reading.' },
  { key: 'uOffset', label: 'Standard uncertainty of the offset', hasUnit: true, hint: undefined },
  { key: 'slope', label: 'Slope', hasUnit: false, hint: undefined },
  { key: 'uSlope', label: 'Standard uncertainty of the slope', hasUnit: false, hint: undefined },
  {
    key: 'covariance',
    label: 'Covariance of both',
    hasUnit: true,
    hint: 'The product of both uncertainties and their correlation; 0 where none is known.',
  },
] as const;

function Figures({ draft, change, unit }: PartProps) {
  return (
    <View className="gap-4">
      {figures.map(({ key, label, hasUnit, hint }) => (
        <Field
          key={key}
          label={label}
          value={draft[key]}
          type="number"
          unit={hasUnit ? unit : ''}
          hint={hint}
          onChange={(text) => change({ [key]: text })}
          testID={`calibration-${key}`}
        />
      ))}
    </View>
  );
}
