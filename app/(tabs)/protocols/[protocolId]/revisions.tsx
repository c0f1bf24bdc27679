import { ProtocolRevisionsScreen } from '@/components/protocols/revisions-screen';

export default function ProtocolRevisions() {
  return <ProtocolRevisionsScreen />;
}
