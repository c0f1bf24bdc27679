import { EvaluationScreen } from '@/components/evaluation/evaluation-screen';

export default function Evaluation() {
  return <EvaluationScreen />;
}
