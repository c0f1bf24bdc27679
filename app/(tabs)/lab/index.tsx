import { LabScreen } from '@/components/lab/lab-screen';

export default function Lab() {
  return <LabScreen />;
}
