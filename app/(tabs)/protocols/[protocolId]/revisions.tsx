import { ProtocolRevisionsScreen } from '@/components/shell/lazy-screens';

export default function ProtocolRevisions() {
  return <ProtocolRevisionsScreen />;
}
