import { useLabQuery } from '@/components/api';
import { isShown } from '@/components/alarms/alarm-words';
import { listAlarms } from '@/shared/contracts/alarms';
import { LabLink } from './lab-link';

/** The way to the alarms, also while none stands. */
export function AlarmsLink() {
  const items = useLabQuery(listAlarms).data?.data.items;
  const count = items?.filter(isShown).length ?? 0;
  const words = items === undefined ? '…' : count === 0 ? 'none stands' : count === 1 ? 'one stands' : `${String(count)} stand`;
  return <LabLink href="/alarms" icon="warning" tone={count === 0 ? 'dim' : 'lamp'} title="Alarms" words={words} testID="to-alarms" />;
}
