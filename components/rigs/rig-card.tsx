import { Link, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Chip, Heading, Icon, Label, Num } from '@/components/ui';
import type { RigSummary } from '@/shared/contracts/rigs';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatClockWithZone } from '@/shared/lib/format-time';
import { linkName, linkState } from './link-words';

/** One rig in the list: its link, where it stands, who answers for it, what it runs. The whole card leads to its page. */
export function RigCard({ rig }: { rig: RigSummary }) {
  const { timeZone } = useLab();
  const link = linkState(rig.live);
  return (
    <Link
      href={`/rigs/${rig.id}` as Href}
      testID={`rig-${rig.id}`}
      className="rounded-panel border border-panel bg-panel p-4 hover:border-line wide:w-[calc(50%-8px)]"
      style={{ display: 'flex', flexDirection: 'column', gap: 12 }}
    >
      <View className="w-full flex-row flex-wrap items-center justify-between gap-2">
        <Heading level={2} size={20}>
          {rig.name}
        </Heading>
        <Chip dot={link.tone} tone={link.tone === 'danger' ? 'danger' : 'dim'}>
          {link.words}
        </Chip>
      </View>
      <View className="w-full flex-row items-end justify-between gap-3">
        <View>
          <Num size={30} light tone={rig.live.condition === 'ready' ? 'text' : 'dim'}>
            {formatDegrees(rig.live.angleDeg)}
          </Num>
          <Label>{rig.live.moving ? 'turntable, moving' : 'turntable'}</Label>
        </View>
        <View className="shrink items-end">
          <Label className="text-right">{linkName(rig.link)}</Label>
          <Label>revision {rig.revision}</Label>
        </View>
      </View>
      <View className="w-full gap-1.5 border-t border-line pt-3">
        <Line
          icon="key"
          words={
            rig.arm === null
              ? 'Not armed'
              : `Armed by ${rig.arm.name} until ${formatClockWithZone(Date.parse(rig.arm.until), { timeZone, weekday: true })}`
          }
        />
        <Line
          icon={rig.activeRun === null ? 'clear' : 'start'}
          words={rig.activeRun === null ? 'Nothing is running' : `${rig.activeRun.protocolName}, ${rig.activeRun.state}`}
          lit={rig.activeRun !== null}
        />
      </View>
    </Link>
  );
}

function Line({ icon, words, lit = false }: { icon: 'key' | 'clear' | 'start'; words: string; lit?: boolean }) {
  return (
    <View className="flex-row items-center gap-2">
      <Icon name={icon} size={16} tone={lit ? 'lamp' : 'dim'} />
      <Body size={13} tone={lit ? 'text' : 'dim'} className="flex-1">
        {words}
      </Body>
    </View>
  );
}
