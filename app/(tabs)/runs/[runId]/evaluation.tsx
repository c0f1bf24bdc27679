import { EvaluationScreen } from '@/components/shell/lazy-screens';

export default function Evaluation() {
  return <EvaluationScreen />;
}
