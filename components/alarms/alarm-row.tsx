import { Link, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Icon, Label, Num } from '@/components/ui';
import type { AlarmView } from '@/shared/contracts/alarms';
import { markOf, placeOf, priorityWords, stateWords, whenWords } from './alarm-words';

/** One alarm in a list; what follows from it stands under it. */
export function AlarmRow({ alarm, nowIso, under = false }: { alarm: AlarmView; nowIso: string; under?: boolean }) {
  const { timeZone } = useLab();
  const mark = markOf(alarm);
  return (
    <Link
      href={`/alarms/${alarm.id}` as Href}
      className={`min-h-[60px] flex-row items-center gap-3 border-b border-line py-2 last:border-b-0 hover:bg-panel2 ${under ? 'pl-8' : ''}`}
      style={{ display: 'flex', flexDirection: 'row' }}
      testID="alarm-row"
    >
      <Icon name={mark.icon} size={22} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
      <View className="min-w-0 flex-1">
        <Body strong numberOfLines={2}>
          {alarm.title}
        </Body>
        <Label numberOfLines={2}>
          {priorityWords[alarm.priority]}, {placeOf(alarm)}: {stateWords[alarm.state]}
          {alarm.state === 'active-acknowledged' && alarm.acknowledged !== null ? ` by ${alarm.acknowledged.by}` : ''}
        </Label>
      </View>
      {alarm.raisedAt === null ? null : (
        <Num size={13} tone="dim">
          {whenWords(alarm.raisedAt, { timeZone, nowIso })}
        </Num>
      )}
      <Icon name="forward" size={16} tone="faint" />
    </Link>
  );
}
