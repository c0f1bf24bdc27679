import { useState } from 'react';
import { View } from 'react-native';
import { isProblem, useLabMutation, wordsOf } from '@/components/api';
import { Body, Button, Field, Label, Num, ProblemNotice, Sheet, useToast } from '@/components/ui';
import { reviseRig, type RigView } from '@/shared/contracts/rigs';
import type { DocumentChange } from './document-rows';
import { quantityLine } from './quantity-words';
import type { RigDraft } from './use-rig-draft';
import { useRefreshRigs } from './use-rig';

interface ReviseSheetProps {
  rig: RigView;
  etag: string | undefined;
  draft: RigDraft;
  onClose: () => void;
}

/** Before and after of every change, the reason, and the new revision. */
export function ReviseSheet({ rig, etag, draft, onClose }: ReviseSheetProps) {
  const toast = useToast();
  const refresh = useRefreshRigs();
  const [name, setName] = useState(rig.name);
  const [reason, setReason] = useState('');
  const save = useLabMutation(reviseRig, ({ data }) => {
    draft.discard();
    refresh();
    toast.show({ text: `Revision ${data.revision} of ${data.name} is made.` });
    onClose();
  });
  const overtaken = isProblem(save.error, 'edited-meanwhile');
  const submit = () =>
    save.mutate({ params: { rigId: rig.id }, ifMatch: etag, body: { name: name.trim(), document: draft.document, reason: reason.trim() } });
  return (
    <Sheet
      open
      title={`Make revision ${rig.revision + 1}`}
      onClose={onClose}
      footer={
        <Button
          kind="primary"
          size="action"
          label="Make the revision"
          disabled={reason.trim() === '' || name.trim() === ''}
          busy={save.isPending}
          onPress={submit}
          testID="revise"
        />
      }
    >
      <ChangeList changes={draft.changes} />
      <Field label="Name of the rig" value={name} onChange={setName} />
      <Field
        label="Reason"
        value={reason}
        onChange={setReason}
        lines={2}
        hint="What was measured or changed, with what. It stays with the revision for ever."
        testID="revise-reason"
      />
      {save.isError ? (
        <ProblemNotice
          title={overtaken ? 'Somebody made a revision meanwhile' : 'No revision was made'}
          {...wordsOf(save.error)}
          {...(overtaken ? { action: { label: 'Read the newest and keep my changes', onPress: () => (refresh(), save.reset()) } } : {})}
        />
      ) : null}
    </Sheet>
  );
}

/** Changes one below the other: what, before, after. */
export function ChangeList({ changes }: { changes: readonly DocumentChange[] }) {
  if (changes.length === 0) return <Label>No quantity differs.</Label>;
  return (
    <View className="gap-2">
      {changes.map((change) => (
        <View key={change.path} className="rounded-lg border border-line px-3 py-2">
          <Body size={13} tone="dim">
            {change.group}: {change.label}
          </Body>
          <Num tone="dim">
            <Label>was </Label>
            {quantityLine(change.before)}
          </Num>
          <Num>
            <Label>is </Label>
            {quantityLine(change.after)}
          </Num>
        </View>
      ))}
    </View>
  );
}
