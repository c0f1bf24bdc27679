import { LabScreen } from '@/components/shell/lazy-screens';

export default function Lab() {
  return <LabScreen />;
}
