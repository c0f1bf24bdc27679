import { InvitationScreen } from '@/components/people/invitation-screen';

export default function Invitation() {
  return <InvitationScreen />;
}
