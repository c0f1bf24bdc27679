import { DoorPage } from '@/components/doors/door-page';

export default function Door() {
  return <DoorPage />;
}
