import { AlarmScreen } from '@/components/shell/lazy-screens';

export default function Alarm() {
  return <AlarmScreen />;
}
