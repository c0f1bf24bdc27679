import { RunsScreen } from '@/components/shell/lazy-screens';

export default function Runs() {
  return <RunsScreen />;
}
