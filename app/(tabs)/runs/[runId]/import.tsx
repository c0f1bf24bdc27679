import { ImportScreen } from '@/components/data/import-screen';

export default function Import() {
  return <ImportScreen />;
}
