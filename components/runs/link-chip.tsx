import { View } from 'react-native';
import { Chip, Icon, Label, type IconName, type Tone } from '@/components/ui';
import { formatAgo } from '@/shared/lib/format-duration';
import type { LinkAge } from './link-age';

const looks: Record<LinkAge['grade'], { tone: Tone; dot: Tone; icon: IconName | null }> = {
  live: { tone: 'dim', dot: 'good', icon: null },
  stale: { tone: 'text', dot: 'lamp', icon: 'wait' },
  lost: { tone: 'danger', dot: 'danger', icon: 'offline' },
};

/** How fresh the screen is, as one word and an age: `live 0.4 s`, `stale 3 s`, `lost`. */
export function LinkChip({ age }: { age: LinkAge }) {
  const look = looks[age.grade];
  const text =
    age.ageS === null
      ? 'waiting'
      : age.grade === 'live'
        ? `live ${age.ageS.toFixed(1)}\u202fs`
        : age.grade === 'stale'
          ? `stale ${Math.floor(age.ageS)}\u202fs`
          : 'lost';
  return (
    <Chip dot={look.dot} tone={look.tone} mono testID="link-chip">
      {text}
    </Chip>
  );
}

const silence: Record<'page' | 'rig', string> = {
  page: 'Nothing heard from the server. The run goes on without this page.',
  rig: 'The server hears nothing from the controller. The run holds or goes on by its protocol.',
};

/** Says over the whole width that what is shown is old, and which leg of the line is silent, or that nobody drives the rig. */
export function LostNotice({ age, notDriven }: { age: LinkAge; notDriven: string | undefined }) {
  if (age.grade !== 'lost') return null;
  return (
    <View role="alert" className="flex-row items-center gap-3 rounded-panel border-2 border-danger bg-panel p-3" testID="lost-notice">
      <Icon name="offline" tone="danger" />
      <View className="flex-1">
        <Label size={15} tone="text">
          {age.ageS === null ? 'Not heard yet.' : `Last known ${formatAgo(age.ageS)}.`}{' '}
          {age.silent === 'rig' && notDriven !== undefined ? notDriven : silence[age.silent ?? 'page']}
        </Label>
      </View>
    </View>
  );
}
