import { StepLogScreen } from '@/components/runs/step-log-screen';

export default function StepLog() {
  return <StepLogScreen />;
}
