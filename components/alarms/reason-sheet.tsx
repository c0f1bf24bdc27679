import { useState } from 'react';
import { fieldErrors, useLabMutation, wordsOf } from '@/components/api';
import { Body, Button, Check, Field, ProblemNotice, Select, Sheet } from '@/components/ui';
import { confirmAlarm, shelveAlarm, takeAlarmOut, type AlarmView } from '@/shared/contracts/alarms';
import { formatDuration } from '@/shared/lib/format-duration';

export type ReasonKind = 'confirm' | 'shelve' | 'take-out';

const words = {
  confirm: { title: 'It is done', field: 'What was done', act: 'Keep it', failed: 'It was not kept' },
  shelve: { title: 'Shelve for a time', field: 'Why', act: 'Shelve', failed: 'It was not shelved' },
  'take-out': { title: 'Take out of service', field: 'Why', act: 'Take out of service', failed: 'It stays in service' },
} as const;

const lengths = [15, 30, 60, 120, 240, 480, 720];

interface ReasonSheetProps {
  kind: ReasonKind;
  alarm: AlarmView;
  onClose: () => void;
  onDone: () => void;
}

/** What was done, or why an alarm is put aside and for how long. */
export function ReasonSheet({ kind, alarm, onClose, onDone }: ReasonSheetProps) {
  const done = () => {
    onDone();
    onClose();
  };
  const confirm = useLabMutation(confirmAlarm, done);
  const shelve = useLabMutation(shelveAlarm, done);
  const takeOut = useLabMutation(takeAlarmOut, done);
  const allowed = lengths.filter((minutes) => minutes <= alarm.shelveAtMostMin);
  const [text, setText] = useState('');
  const [forMin, setForMin] = useState(String(allowed.includes(60) ? 60 : (allowed[0] ?? 15)));
  const [oneShot, setOneShot] = useState(false);
  const params = { alarmId: alarm.id };
  const act = { confirm, shelve, 'take-out': takeOut }[kind];
  const said = text.trim();
  const send = () => {
    if (kind === 'confirm') confirm.mutate({ params, body: { note: said } });
    else if (kind === 'shelve') shelve.mutate({ params, body: { forMin: Number(forMin), reason: said, oneShot } });
    else takeOut.mutate({ params, body: { reason: said } });
  };
  const errors = fieldErrors(act.error);
  return (
    <Sheet
      open
      title={words[kind].title}
      onClose={onClose}
      testID="reason-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label={words[kind].act}
          busy={act.isPending}
          disabled={kind !== 'confirm' && said.length < 3}
          onPress={send}
          testID="reason-send"
        />
      }
    >
      {kind === 'confirm' ? null : (
        <Body tone="dim">
          {kind === 'shelve'
            ? `It tells nobody until then, and comes back if its condition still holds. This one may be shelved for ${formatDuration(60 * alarm.shelveAtMostMin)} at most.`
            : 'It tells nobody until somebody returns it to service.'}
        </Body>
      )}
      {kind === 'shelve' ? (
        <Select
          label="For"
          value={forMin}
          options={allowed.map((minutes) => ({ value: String(minutes), label: formatDuration(60 * minutes) }))}
          onChange={setForMin}
          error={errors['forMin']}
          testID="shelve-for"
        />
      ) : null}
      <Field
        label={words[kind].field}
        value={text}
        onChange={setText}
        error={errors['reason'] ?? errors['note']}
        hint="Kept in the history with your name."
        testID="reason-text"
      />
      {kind === 'shelve' ? (
        <Check label="Bring it back as soon as its condition has gone away." value={oneShot} onChange={setOneShot} testID="one-shot" />
      ) : null}
      {act.isError ? <ProblemNotice title={words[kind].failed} {...wordsOf(act.error)} /> : null}
    </Sheet>
  );
}
