import { useState } from 'react';
import { Pressable, View } from 'react-native';
import { useLab, useLabQuery, useMay, useSession, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Chip, Icon, Label, Loading, Panel, ProblemNotice, Section } from '@/components/ui';
import { listMembers, type InvitationView, type MemberView } from '@/shared/contracts/people';
import { formatDay } from '@/shared/lib/format-time';
import { InvitationSheet } from './invitation-sheet';
import { InviteSheet } from './invite-sheet';
import { MemberSheet } from './member-sheet';

/** Members with their roles, and the invitations still open. */
export function Members() {
  const mayManage = useMay('members.manage').ok;
  const list = useLabQuery(listMembers);
  const [inviting, setInviting] = useState(false);
  const [member, setMember] = useState<MemberView | null>(null);
  const [invitation, setInvitation] = useState<InvitationView | null>(null);
  return (
    <Section
      title="Members"
      trailing={
        mayManage ? <Button kind="quiet" icon="plus" label="Invite" onPress={() => setInviting(true)} testID="invite" /> : undefined
      }
    >
      <MayNote act="members.manage" />
      {list.isPending ? <Loading label="Loading members" /> : null}
      {list.isError ? (
        <ProblemNotice
          title="Members could not be read"
          {...wordsOf(list.error)}
          action={{ label: 'Try again', onPress: () => void list.refetch() }}
        />
      ) : null}
      {list.data === undefined ? null : (
        <Panel className="py-1">
          {list.data.data.members.map((each) => (
            <MemberRow key={each.userId} member={each} onPress={mayManage ? () => setMember(each) : undefined} />
          ))}
          {list.data.data.invitations.map((each) => (
            <InvitationRow key={each.id} invitation={each} onPress={mayManage ? () => setInvitation(each) : undefined} />
          ))}
        </Panel>
      )}
      {inviting ? <InviteSheet onClose={() => setInviting(false)} /> : null}
      {member === null ? null : <MemberSheet member={member} onClose={() => setMember(null)} />}
      {invitation === null ? null : <InvitationSheet invitation={invitation} onClose={() => setInvitation(null)} />}
    </Section>
  );
}

interface LineProps {
  title: string;
  under: string;
  chip: string;
  label: string;
  onPress?: (() => void) | undefined;
}

function Line({ title, under, chip, label, onPress }: LineProps) {
  const inside = (
    <>
      <View className="min-w-0 flex-1">
        <Body strong numberOfLines={1}>
          {title}
        </Body>
        <Label numberOfLines={1}>{under}</Label>
      </View>
      <Chip>{chip}</Chip>
      {onPress === undefined ? null : <Icon name="forward" size={16} tone="faint" />}
    </>
  );
  const shape = 'min-h-[60px] flex-row items-center gap-3 border-b border-line py-2 last:border-b-0';
  if (onPress === undefined) return <View className={shape}>{inside}</View>;
  return (
    <Pressable role="button" aria-label={label} onPress={onPress} className={`${shape} -mx-2 rounded-lg px-2 hover:bg-panel2`}>
      {inside}
    </Pressable>
  );
}

function MemberRow({ member, onPress }: { member: MemberView; onPress?: (() => void) | undefined }) {
  const { state } = useSession();
  const own = state.kind === 'signed-in' && state.me.user.id === member.userId;
  return (
    <Line
      title={own ? `${member.name} (you)` : member.name}
      under={member.email}
      chip={member.role}
      label={`${member.name}, ${member.role}: change role or remove`}
      onPress={onPress}
    />
  );
}

function InvitationRow({ invitation, onPress }: { invitation: InvitationView; onPress?: (() => void) | undefined }) {
  const { timeZone } = useLab();
  return (
    <Line
      title={invitation.email}
      under={`invited by ${invitation.invitedBy}, open until ${formatDay(Date.parse(invitation.expiresAt), timeZone)}`}
      chip={`${invitation.role}, invited`}
      label={`Invitation of ${invitation.email}: withdraw`}
      onPress={onPress}
    />
  );
}
