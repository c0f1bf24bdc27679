import { ImportScreen } from '@/components/shell/lazy-screens';

export default function Import() {
  return <ImportScreen />;
}
