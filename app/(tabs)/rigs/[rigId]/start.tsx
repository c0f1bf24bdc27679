import { StartScreen } from '@/components/shell/lazy-screens';

export default function StartRun() {
  return <StartScreen />;
}
