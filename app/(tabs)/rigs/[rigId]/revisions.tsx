import { RigRevisionsScreen } from '@/components/shell/lazy-screens';

export default function RigRevisions() {
  return <RigRevisionsScreen />;
}
