import { LinkScreen } from '@/components/shell/lazy-screens';

export default function RigLink() {
  return <LinkScreen />;
}
