import { RunScreen } from '@/components/shell/lazy-screens';

export default function Run() {
  return <RunScreen />;
}
