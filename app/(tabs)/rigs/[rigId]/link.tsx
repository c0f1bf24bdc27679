import { LinkScreen } from '@/components/rigs/link-screen';

export default function RigLink() {
  return <LinkScreen />;
}
