import { DataScreen } from '@/components/shell/lazy-screens';

export default function Data() {
  return <DataScreen />;
}
