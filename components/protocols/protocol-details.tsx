import { useState } from 'react';
import { View } from 'react-native';
import { Field, Label, Select } from '@/components/ui';
import { zoneName } from '@/shared/lib/format-time';
import type { InterruptionPolicy } from '@/shared/protocol/document';
import { useEditor } from './editor-context';
import { GoodWhenFields } from './good-when-fields';
import type { PlanningRig } from './use-planning-rig';

interface ProtocolDetailsProps {
  planning: PlanningRig;
  startAt: string;
  onStartAt: (startAt: string) => void;
}

const policies: readonly { value: InterruptionPolicy; label: string }[] = [
  { value: 'hold', label: 'hold until a person resumes' },
  { value: 'resume', label: 'resume by itself where that is sound' },
  { value: 'stop', label: 'stop the run' },
];

const stays = ' stays';

/** What belongs to the protocol as a whole, and for which rig and start it is planned here. */
export function ProtocolDetails({ planning, startAt, onStartAt }: ProtocolDetailsProps) {
  const { document, rig, timeZone, mayWrite, changeDocument } = useEditor();
  const stations = Object.keys(rig?.document.stations ?? {});
  const atEnd = document.atEnd?.station;
  const drivers = document.atEnd?.drivers;
  const setAtEnd = (station: string) =>
    changeDocument({
      atEnd:
        station === stays ? (drivers === undefined ? undefined : { drivers }) : { station, ...(drivers === undefined ? {} : { drivers }) },
    });
  const setDrivers = (next: 'keep' | 'release') => {
    const station = atEnd === undefined ? {} : { station: atEnd };
    changeDocument({
      atEnd: next === 'release' ? { ...station, drivers: next } : atEnd === undefined ? undefined : { ...station, drivers: next },
    });
  };
  return (
    <View className="gap-5" testID="protocol-details">
      <NameField />
      <Field
        label="Notes"
        value={document.notes ?? ''}
        onChange={(notes) => changeDocument({ notes }, 'notes')}
        lines={3}
        disabled={!mayWrite}
      />
      <Select
        label="After an interruption"
        value={document.onInterruption ?? 'hold'}
        options={policies}
        onChange={(onInterruption) => changeDocument({ onInterruption })}
        hint="A lost link, a server restart, a lost database. A controller reset, an interlock or a lost supply never resumes by itself."
        disabled={!mayWrite}
        testID="on-interruption"
      />
      <Select
        label="When it has finished"
        value={atEnd ?? stays}
        options={[
          { value: stays, label: 'the sources stay' },
          ...[...new Set([...stations, ...(atEnd === undefined ? [] : [atEnd])])].map((name) => ({
            value: name,
            label: `the sources turn to ${name}`,
          })),
        ]}
        onChange={setAtEnd}
        hint="After a stop, a failure or in a hold nothing moves."
        disabled={!mayWrite}
        testID="at-end"
      />
      <Select
        label="The drivers then"
        value={drivers ?? 'keep'}
        options={[
          { value: 'keep', label: 'keep their torque' },
          { value: 'release', label: 'let go: the position is lost' },
        ]}
        onChange={setDrivers}
        disabled={!mayWrite}
        testID="at-end-drivers"
      />
      <GoodWhenFields />
      <View className="gap-5 border-t border-line pt-5">
        {planning.rigs.length === 0 ? (
          <Label>No rig in this lab yet: nothing can be predicted.</Label>
        ) : (
          <Select
            label="Planned on"
            value={rig?.id ?? ''}
            options={planning.rigs.map(({ id, name }) => ({ value: id, label: name }))}
            onChange={planning.choose}
            hint="Only for the prediction here; the document does not name a rig."
            testID="planning-rig"
          />
        )}
        <Field
          label="If started at"
          type="time"
          value={startAt}
          onChange={onStartAt}
          hint={`Lab time, ${zoneName(timeZone)}. Empty: now.`}
          testID="start-at"
        />
      </View>
    </View>
  );
}

/** The name goes into the document while it is one; an empty one stays here with the reason. */
function NameField() {
  const { document, mayWrite, changeDocument } = useEditor();
  const [emptied, setEmptied] = useState(false);
  const change = (name: string) => {
    setEmptied(name.trim() === '');
    if (name.trim() !== '') changeDocument({ name: name.slice(0, 120) }, 'name');
  };
  return (
    <Field
      label="Name"
      value={emptied ? '' : document.name}
      onChange={change}
      onBlur={() => setEmptied(false)}
      error={emptied ? 'the protocol needs a name; the last one is kept' : undefined}
      disabled={!mayWrite}
      testID="protocol-name"
    />
  );
}
