import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { labKey, useLab, useLabMutation, useLabQuery, useMay, useSession, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Field, IconButton, Label, Panel, ProblemNotice, Section, Select, Sheet, useToast } from '@/components/ui';
import { changeLab, getLab } from '@/shared/contracts/people';
import { zoneName } from '@/shared/lib/format-time';

/** Name and time zone of the lab. */
export function LabSettings() {
  const lab = useLab();
  const { data } = useLabQuery(getLab);
  const mayChange = useMay('lab.settings').ok;
  const [open, setOpen] = useState(false);
  const name = data?.data.name ?? lab.labName;
  const timeZone = data?.data.timeZone ?? lab.timeZone;
  return (
    <Section
      title="Lab"
      trailing={
        mayChange ? (
          <IconButton icon="edit" label="Change name and time zone" onPress={() => setOpen(true)} testID="change-lab" />
        ) : undefined
      }
    >
      <Panel className="gap-3">
        <Body strong size={17}>
          {name}
        </Body>
        <View>
          <Label>Time zone</Label>
          <Body testID="lab-zone">{zoneName(timeZone)}</Body>
          <Label className="pt-1">Every clock time of the lab is meant and shown in it.</Label>
        </View>
        <MayNote act="lab.settings" />
      </Panel>
      {open ? <LabSheet name={name} timeZone={timeZone} onClose={() => setOpen(false)} /> : null}
    </Section>
  );
}

function LabSheet({ onClose, ...before }: { name: string; timeZone: string; onClose: () => void }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const toast = useToast();
  const { refresh } = useSession();
  const [name, setName] = useState(before.name);
  const [timeZone, setTimeZone] = useState(before.timeZone);
  const zones = [...new Set([before.timeZone, 'UTC', ...Intl.supportedValuesOf('timeZone')])].sort();
  const save = useLabMutation(changeLab, () => {
    void queries.invalidateQueries({ queryKey: labKey(labId, getLab) });
    void refresh();
    toast.show({ text: 'The lab is changed.' });
    onClose();
  });
  return (
    <Sheet
      open
      title="The lab"
      onClose={onClose}
      footer={
        <Button
          kind="primary"
          size="action"
          label="Save"
          busy={save.isPending}
          disabled={name.trim() === ''}
          onPress={() => save.mutate({ body: { name: name.trim(), timeZone } })}
        />
      }
    >
      <Field label="Name" value={name} onChange={setName} error={name.trim() === '' ? 'the lab needs a name' : undefined} />
      <Select
        label="Time zone"
        value={timeZone}
        options={zones.map((zone) => ({ value: zone, label: zoneName(zone) }))}
        onChange={setTimeZone}
        hint="Times of day in protocols are meant in it. A running run keeps the zone it was started with."
      />
      {save.isError ? <ProblemNotice title="The lab was not changed" {...wordsOf(save.error)} /> : null}
    </Sheet>
  );
}
