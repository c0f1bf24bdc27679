import { Link, type Href } from 'expo-router';
import { useLabQuery } from '@/components/api';
import { isShown } from '@/components/alarms/alarm-words';
import { Body, Icon, Label } from '@/components/ui';
import { listAlarms } from '@/shared/contracts/alarms';

/** The way to the alarms, also while none stands. */
export function AlarmsLink() {
  const items = useLabQuery(listAlarms).data?.data.items;
  const count = items?.filter(isShown).length ?? 0;
  const words = items === undefined ? '…' : count === 0 ? 'none stands' : count === 1 ? 'one stands' : `${String(count)} stand`;
  return (
    <Link
      href={'/alarms' as Href}
      className="min-h-[60px] flex-row items-center gap-3 rounded-panel bg-panel px-4 py-2 hover:bg-panel2"
      style={{ display: 'flex', flexDirection: 'row' }}
      testID="to-alarms"
    >
      <Icon name="warning" size={22} tone={count === 0 ? 'dim' : 'lamp'} />
      <Body strong className="flex-1">
        Alarms
      </Body>
      <Label>{words}</Label>
      <Icon name="forward" size={18} tone="dim" />
    </Link>
  );
}
