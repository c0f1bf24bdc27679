import { DoorScreen } from '@/components/shell/lazy-screens';

export default function RigDoor() {
  return <DoorScreen />;
}
