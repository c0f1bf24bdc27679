import { CalendarScreen } from '@/components/shell/lazy-screens';

export default function Calendar() {
  return <CalendarScreen />;
}
