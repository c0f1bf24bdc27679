import { RigsScreen } from '@/components/rigs/rigs-screen';

export default function Rigs() {
  return <RigsScreen />;
}
