import { FirstMoveScreen } from '@/components/shell/lazy-screens';

export default function FirstMove() {
  return <FirstMoveScreen />;
}
