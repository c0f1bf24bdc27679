import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { labKey, useLab, useLabMutation, wordsOf } from '@/components/api';
import { Body, Button, ProblemNotice, Select, Sheet, useToast } from '@/components/ui';
import { changeMemberRole, listMembers, removeMember, type MemberView } from '@/shared/contracts/people';
import { roleOptions, roleSummary } from './role-words';

/** One member: another role, or out of the lab after a second press. */
export function MemberSheet({ member, onClose }: { member: MemberView; onClose: () => void }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const toast = useToast();
  const [role, setRole] = useState(member.role);
  const [asked, setAsked] = useState(false);
  const done = (text: string) => {
    void queries.invalidateQueries({ queryKey: labKey(labId, listMembers) });
    toast.show({ text });
    onClose();
  };
  const change = useLabMutation(changeMemberRole, () => done(`${member.name} is now ${role}.`));
  const remove = useLabMutation(removeMember, () => done(`${member.name} is no longer a member.`));
  const failure = change.error ?? remove.error;
  const params = { userId: member.userId };
  return (
    <Sheet
      open
      title={member.name}
      onClose={onClose}
      footer={
        <Button
          kind="primary"
          size="action"
          label="Save the role"
          disabled={role === member.role}
          busy={change.isPending}
          onPress={() => change.mutate({ params, body: { role } })}
        />
      }
    >
      <Body tone="dim">{member.email}</Body>
      <Select label="Role" value={role} options={roleOptions} onChange={setRole} hint={`May: ${roleSummary[role]}.`} />
      {failure === null ? null : <ProblemNotice title="Nothing was changed" {...wordsOf(failure)} />}
      {asked ? (
        <View className="gap-3 rounded-panel border border-danger p-4">
          <Body>{member.name} loses access to this lab at once. What they did stays in the logs. An invitation brings them back.</Body>
          <Button
            kind="danger"
            icon="remove"
            label={`Remove ${member.name}`}
            busy={remove.isPending}
            onPress={() => remove.mutate({ params })}
          />
        </View>
      ) : (
        <Button kind="quiet" label="Remove from the lab" className="self-start" onPress={() => setAsked(true)} />
      )}
    </Sheet>
  );
}
