import { StartScreen } from '@/components/rigs/start-screen';

export default function StartRun() {
  return <StartScreen />;
}
