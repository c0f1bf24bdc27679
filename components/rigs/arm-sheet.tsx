import { useState } from 'react';
import { fieldErrors, serverNowMs, useLab, useLabMutation, useSession, wordsOf } from '@/components/api';
import { Body, Button, Check, Field, Label, ProblemNotice, Select, Sheet } from '@/components/ui';
import { type RigView } from '@/shared/contracts/rigs';
import { arm } from '@/shared/contracts/standing';
import { formatClockWithZone } from '@/shared/lib/format-time';
import { CautionsPanel, useOwnSignature } from './cautions-panel';
import { useRefreshRigs } from './use-rig';

const hours = ['1', '4', '8', '12', '16', '24', '48', '72'] as const;
type Hours = (typeof hours)[number];

/**
 * A named person at the rig signs the cautions and answers for it until a time, 16 h ahead unless said otherwise, 72 h at most. What follows happens
 * at the rig: the key, the exit delay, the closed door.
 */
export function ArmSheet({ rig, onClose }: { rig: RigView; onClose: () => void }) {
  const { timeZone } = useLab();
  const { state } = useSession();
  const refresh = useRefreshRigs();
  const [name, setName] = useState(state.kind === 'signed-in' ? state.me.user.name : '');
  const [forHours, setForHours] = useState<Hours>('16');
  const [note, setNote] = useState('');
  const [onSite, setOnSite] = useState(false);
  const signed = useOwnSignature(rig) !== null;
  const send = useLabMutation(arm, () => {
    refresh();
    onClose();
  });
  const untilMs = serverNowMs() + Number(forHours) * 3_600_000;
  const complete = name.trim() !== '' && onSite && signed;
  const errors = fieldErrors(send.error);
  const submit = () =>
    send.mutate({
      params: { rigId: rig.id },
      body: { name: name.trim(), until: new Date(untilMs).toISOString(), note: note.trim() },
    });
  return (
    <Sheet
      open
      title={`Arm ${rig.name}`}
      onClose={onClose}
      testID="arm-sheet"
      footer={
        <>
          {complete ? null : <Label>Name, place and your signature under the cautions must be given first.</Label>}
          <Button
            kind="primary"
            size="action"
            icon="key"
            label="Arm: to the key"
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
      <CautionsPanel rig={rig} />
      <Check
        label="I am at the rig, I have looked, and nobody will be in the swept circle."
        value={onSite}
        onChange={setOnSite}
        testID="arm-on-site"
      />
      <Body size={13} tone="dim">
        Then turn the arm key on at the controller, leave within the exit delay and close the door. The rig is armed when the delay is over
        with the door closed.
      </Body>
      {send.isError ? <ProblemNotice title="The rig was not armed" {...wordsOf(send.error)} /> : null}
    </Sheet>
  );
}
