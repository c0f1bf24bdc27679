import { Link, usePathname, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLabQuery } from '@/components/api';
import { Body, Icon, Label } from '@/components/ui';
import { listAlarms } from '@/shared/contracts/alarms';
import { byUrgency, isShown, isUnacknowledged, markOf, placeOf, priorityWords, stateWords } from './alarm-words';

const everyMs = 5000;

/** On every screen: the most pressing alarm, how many more there are, and the way to them. Nothing while there is none. */
export function AlarmBar() {
  const pathname = usePathname();
  const { data } = useLabQuery(listAlarms, { everyMs });
  const shown = (data?.data.items ?? []).filter((alarm) => isShown(alarm) && alarm.causeId === null).sort(byUrgency);
  const [first] = shown;
  if (first === undefined || pathname.startsWith('/alarms')) return null;
  const mark = markOf(first);
  const urgent = isUnacknowledged(first);
  const more = shown.length === 1 ? '' : `, and ${shown.length - 1} more`;
  return (
    <View role="alert" className={`flex-none border-b-2 bg-panel2 ${urgent ? 'ef-alarm border-danger' : 'border-line'}`} testID="alarm-bar">
      <Link
        href={(shown.length === 1 ? `/alarms/${first.id}` : '/alarms') as Href}
        className="min-h-target flex-row items-center gap-3 px-4 py-1 hover:bg-panel wide:px-7"
        style={{ display: 'flex', flexDirection: 'row' }}
      >
        <Icon name={mark.icon} size={22} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
        <View className="min-w-0 flex-1">
          <Body strong numberOfLines={1}>
            {first.title}
            {more}
          </Body>
          <Label numberOfLines={1}>
            {priorityWords[first.priority]} alarm, {placeOf(first)}: {stateWords[first.state]}
          </Label>
        </View>
        <Icon name="forward" size={18} tone="dim" />
      </Link>
    </View>
  );
}
