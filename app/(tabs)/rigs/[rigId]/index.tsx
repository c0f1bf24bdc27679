import { RigScreen } from '@/components/shell/lazy-screens';

export default function Rig() {
  return <RigScreen />;
}
