import { DataScreen } from '@/components/data/data-screen';

export default function Data() {
  return <DataScreen />;
}
