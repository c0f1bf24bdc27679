import { RunsScreen } from '@/components/runs/runs-screen';

export default function Runs() {
  return <RunsScreen />;
}
