import { RigsScreen } from '@/components/shell/lazy-screens';

export default function Rigs() {
  return <RigsScreen />;
}
