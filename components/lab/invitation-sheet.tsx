import { useQueryClient } from '@tanstack/react-query';
import { labKey, useLab, useLabMutation, wordsOf } from '@/components/api';
import { Body, Button, ProblemNotice, Sheet } from '@/components/ui';
import { listMembers, withdrawInvitation, type InvitationView } from '@/shared/contracts/people';
import { formatDayAndClock } from '@/shared/lib/format-time';

/** An open invitation and the way to withdraw it. */
export function InvitationSheet({ invitation, onClose }: { invitation: InvitationView; onClose: () => void }) {
  const { labId, timeZone } = useLab();
  const queries = useQueryClient();
  const withdraw = useLabMutation(withdrawInvitation, () => {
    void queries.invalidateQueries({ queryKey: labKey(labId, listMembers) });
    onClose();
  });
  return (
    <Sheet
      open
      title="Invitation"
      onClose={onClose}
      footer={
        <Button
          kind="danger"
          icon="remove"
          label="Withdraw the invitation"
          busy={withdraw.isPending}
          onPress={() => withdraw.mutate({ params: { invitationId: invitation.id } })}
        />
      }
    >
      <Body>
        {invitation.email} was invited as {invitation.role} by {invitation.invitedBy}. The link of the mail works until{' '}
        {formatDayAndClock(Date.parse(invitation.expiresAt), timeZone)}.
      </Body>
      {withdraw.isError ? <ProblemNotice title="The invitation was not withdrawn" {...wordsOf(withdraw.error)} /> : null}
    </Sheet>
  );
}
