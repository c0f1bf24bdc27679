import { zodResolver } from '@hookform/resolvers/zod';
import { useQueryClient } from '@tanstack/react-query';
import { useController, useForm } from 'react-hook-form';
import { labKey, useLab, useLabCall } from '@/components/api';
import { Body, Button, FormField, Select, Sheet, showProblem, useToast } from '@/components/ui';
import { invite, listMembers } from '@/shared/contracts/people';
import { roleOptions, roleSummary } from './role-words';

/** Invites somebody by e-mail into a role. */
export function InviteSheet({ onClose }: { onClose: () => void }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const toast = useToast();
  const send = useLabCall(invite);
  const { control, handleSubmit, setError, formState } = useForm({
    resolver: zodResolver(invite.body),
    defaultValues: { email: '', role: 'operator' as const },
  });
  const role = useController({ control, name: 'role' }).field;
  const submit = handleSubmit(async (body) => {
    try {
      await send({ body });
      await queries.invalidateQueries({ queryKey: labKey(labId, listMembers) });
      toast.show({ text: `An invitation is on its way to ${body.email}.` });
      onClose();
    } catch (error) {
      showProblem(error, ['email', 'role'], setError);
    }
  });
  return (
    <Sheet
      open
      title="Invite to the lab"
      onClose={onClose}
      footer={
        <Button
          kind="primary"
          size="action"
          icon="mail"
          label="Send the invitation"
          busy={formState.isSubmitting}
          onPress={() => void submit()}
        />
      }
    >
      <FormField control={control} name="email" label="E-mail" type="email" onEnter={() => void submit()} />
      <Select label="Role" value={role.value} options={roleOptions} onChange={role.onChange} hint={`May: ${roleSummary[role.value]}.`} />
      {formState.errors.root === undefined ? null : (
        <Body role="alert" tone="danger">
          {formState.errors.root.message}
        </Body>
      )}
    </Sheet>
  );
}
