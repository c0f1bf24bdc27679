import { AlarmsScreen } from '@/components/shell/lazy-screens';

export default function Alarms() {
  return <AlarmsScreen />;
}
