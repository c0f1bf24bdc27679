import { RetentionScreen } from '@/components/shell/lazy-screens';

export default function Retention() {
  return <RetentionScreen />;
}
