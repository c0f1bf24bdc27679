import { CompareRunsScreen } from '@/components/shell/lazy-screens';

export default function CompareRuns() {
  return <CompareRunsScreen />;
}
