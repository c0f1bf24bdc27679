import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, serverNowMs, useLab, useLabMutation, useSession, wordsOf } from '@/components/api';
import { Body, Button, Check, Field, Label, ProblemNotice, Select, Sheet } from '@/components/ui';
import { arm, type RigView } from '@/shared/contracts/rigs';
import { formatClockWithZone } from '@/shared/lib/format-time';
import { cautions } from './cautions';
import { useRefreshRigs } from './use-rig';

const hours = ['1', '4', '8', '12', '16', '24', '48', '72'] as const;
type Hours = (typeof hours)[number];

/** A named person at the rig signs the cautions and answers for it until a time, 16 h ahead unless said otherwise, 72 h at most. */
export function ArmSheet({ rig, onClose }: { rig: RigView; onClose: () => void }) {
  const { timeZone } = useLab();
  const { state } = useSession();
  const refresh = useRefreshRigs();
  const [name, setName] = useState(state.kind === 'signed-in' ? state.me.user.name : '');
  const [forHours, setForHours] = useState<Hours>('16');
  const [note, setNote] = useState('');
  const [onSite, setOnSite] = useState(false);
  const [read, setRead] = useState(false);
  const send = useLabMutation(arm, () => {
    refresh();
    onClose();
  });
  const untilMs = serverNowMs() + Number(forHours) * 3_600_000;
  const complete = name.trim() !== '' && onSite && read;
  const errors = fieldErrors(send.error);
  const submit = () =>
    send.mutate({
      params: { rigId: rig.id },
      body: { name: name.trim(), until: new Date(untilMs).toISOString(), note: note.trim(), cautionsRead: true },
    });
  return (
    <Sheet
      open
      title={`Arm ${rig.name}`}
      onClose={onClose}
      testID="arm-sheet"
      footer={
        <>
          {complete ? null : <Label>Name, place and cautions must be given first.</Label>}
          <Button
            kind="primary"
            size="action"
            icon="key"
            label="Arm"
            disabled={!complete}
            busy={send.isPending}
            onPress={submit}
            testID="arm-confirm"
          />
        </>
      }
    >
      <Field label="Who answers for the rig on site" value={name} onChange={setName} autoComplete="name" error={errors['name']} />
      <Select
        label="For how long"
        value={forHours}
        options={hours.map((each) => ({ value: each, label: `${each} h` }))}
        onChange={setForHours}
        hint={`Until ${formatClockWithZone(untilMs, { timeZone, weekday: true })}. A run starts only if it is planned to end before.`}
        error={errors['until']}
      />
      <Field label="Note for whoever starts a run" value={note} onChange={setNote} placeholder="camera glued, do not level" />
      <Cautions />
      <Check
        label="I am at the rig, I have looked, and nobody will be in the swept circle."
        value={onSite}
        onChange={setOnSite}
        testID="arm-on-site"
      />
      <Check label="I have read these cautions and seen to them." value={read} onChange={setRead} testID="arm-cautions" />
      {send.isError ? <ProblemNotice title="The rig was not armed" {...wordsOf(send.error)} /> : null}
    </Sheet>
  );
}

/** The cautions, one line each. */
function Cautions() {
  return (
    <View className="gap-2.5 rounded-panel border border-line p-4">
      {cautions.map((caution) => (
        <View key={caution.title}>
          <Body strong>{caution.title}</Body>
          <Body size={13} tone="dim">
            {caution.words}
          </Body>
        </View>
      ))}
    </View>
  );
}
