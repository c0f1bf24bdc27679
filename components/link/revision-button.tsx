import { useState } from 'react';
import { View } from 'react-native';
import { isProblem, useLabMutation, useMay, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { useRefreshRigs } from '@/components/rigs/use-rig';
import { Button, Field, ProblemNotice, useToast } from '@/components/ui';
import { reviseRig } from '@/shared/contracts/rigs';
import type { RigDocument } from '@/shared/rig/document';
import type { StepProps } from './step-props';

interface RevisionButtonProps extends Pick<StepProps, 'rig' | 'etag'> {
  document: RigDocument | null;
  /** What was measured, in a sentence; the person may add to it. */
  reason: string;
  onMade: () => void;
  testID: string;
}

/** Makes what was measured a new revision of the rig; the ones before stay. */
export function RevisionButton({ rig, etag, document, reason, onMade, testID }: RevisionButtonProps) {
  const toast = useToast();
  const refresh = useRefreshRigs();
  const may = useMay('rig.edit').ok;
  const [added, setAdded] = useState('');
  const save = useLabMutation(reviseRig, ({ data }) => {
    refresh();
    setAdded('');
    onMade();
    toast.show({ text: `Revision ${data.revision} of ${data.name} is made.` });
  });
  if (!may) return <MayNote act="rig.edit" />;
  const whole = [reason, added.trim()].filter((part) => part !== '').join(' ');
  const overtaken = isProblem(save.error, 'edited-meanwhile');
  const submit = () => {
    if (document === null) return;
    save.mutate({ params: { rigId: rig.id }, ifMatch: etag, body: { name: rig.name, document, reason: whole.slice(0, 500) } });
  };
  return (
    <View className="gap-3">
      <Field
        label="With what, by whom (added to the reason)"
        value={added}
        onChange={setAdded}
        placeholder="engraved scale, read twice"
        testID={`${testID}-reason`}
      />
      {save.isError ? (
        <ProblemNotice
          title={overtaken ? 'Somebody made a revision meanwhile' : 'No revision was made'}
          {...wordsOf(save.error)}
          {...(overtaken
            ? { action: { label: 'Read the newest and keep what I measured', onPress: () => (refresh(), save.reset()) } }
            : {})}
        />
      ) : null}
      <Button
        kind="primary"
        label={`Make revision ${rig.revision + 1} with this`}
        disabled={document === null}
        busy={save.isPending}
        onPress={submit}
        testID={testID}
      />
    </View>
  );
}
