import { RigRevisionsScreen } from '@/components/rigs/rig-revisions-screen';

export default function RigRevisions() {
  return <RigRevisionsScreen />;
}
