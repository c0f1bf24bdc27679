import { StepLogScreen } from '@/components/shell/lazy-screens';

export default function StepLog() {
  return <StepLogScreen />;
}
