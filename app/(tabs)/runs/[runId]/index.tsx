import { RunScreen } from '@/components/runs/run-screen';

export default function Run() {
  return <RunScreen />;
}
