import { RigScreen } from '@/components/rigs/rig-screen';

export default function Rig() {
  return <RigScreen />;
}
