import { Pressable, View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Icon, Label, Num, Panel, Section } from '@/components/ui';
import type { RunAlarm } from '@/shared/contracts/alarms';
import { formatClock } from '@/shared/lib/format-time';
import { alarmMoment, type AlarmMoment } from './moment';

const looks = {
  'to come': { icon: 'wait', tone: 'dim' },
  now: { icon: 'warning', tone: 'danger' },
  over: { icon: 'tick', tone: 'dim' },
} as const satisfies Record<AlarmMoment, object>;

/** Which alarms stand at the moment: one line, as long as any does. */
export function StandingAlarms({ alarms, atUtcMs }: { alarms: readonly RunAlarm[]; atUtcMs: number }) {
  const standing = alarms.filter((alarm) => alarmMoment(alarm, atUtcMs) === 'now');
  if (standing.length === 0) return null;
  return (
    <View className="flex-row items-start gap-2" testID="replay-alarm">
      <Icon name="warning" size={20} tone="danger" />
      <Body className="min-w-0 shrink" strong>
        {standing.map(({ title }) => title).join(', ')}
      </Body>
    </View>
  );
}

/** Every alarm of the night; each leads to the moment at which it was raised. */
export function ReplayAlarms({ alarms, atUtcMs, onGo }: { alarms: readonly RunAlarm[]; atUtcMs: number; onGo: (utcMs: number) => void }) {
  const { timeZone } = useLab();
  if (alarms.length === 0) return null;
  const clock = (iso: string) => formatClock(Date.parse(iso), { timeZone, precision: 'seconds' });
  return (
    <Section title="Alarms" remark="Each leads to the moment at which it was raised.">
      <Panel className="py-1" testID="replay-alarms">
        {alarms.map((alarm) => {
          const moment = alarmMoment(alarm, atUtcMs);
          const { icon, tone } = looks[moment];
          return (
            <Pressable
              key={`${alarm.alarmId} ${alarm.occurrence}`}
              role="button"
              onPress={() => onGo(Date.parse(alarm.raisedAt))}
              className="min-h-target flex-row items-center gap-3 border-b border-line py-2 last:border-b-0 hover:bg-panel2"
              testID="replay-alarm-row"
            >
              <Icon name={icon} tone={tone} />
              <View className="min-w-0 flex-1">
                <Body strong={moment === 'now'}>{alarm.title}</Body>
                <Label>
                  <Num size={13}>{clock(alarm.raisedAt)}</Num>
                  {alarm.untilAt === null || alarm.untilAt === alarm.raisedAt ? null : (
                    <>
                      {' to '}
                      <Num size={13}>{clock(alarm.untilAt)}</Num>
                    </>
                  )}
                  {moment === 'now' ? ', at this moment' : `, ${moment}`}
                </Label>
              </View>
            </Pressable>
          );
        })}
      </Panel>
    </Section>
  );
}
