import { ReplayScreen } from '@/components/shell/lazy-screens';

export default function Replay() {
  return <ReplayScreen />;
}
