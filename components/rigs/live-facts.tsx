import { View } from 'react-native';
import { Body, Icon, Label, Num } from '@/components/ui';
import type { RigLive } from '@/shared/contracts/rigs';
import { formatDegrees } from '@/shared/lib/format-angle';

type Fact = { label: string; words: string; state: 'good' | 'bad' | 'unknown' };

const yesNo = (value: boolean | null, words: { yes: string; no: string }): Pick<Fact, 'words' | 'state'> =>
  value === null ? { words: 'unknown', state: 'unknown' } : value ? { words: words.yes, state: 'good' } : { words: words.no, state: 'bad' };

const factsOf = (live: RigLive): Fact[] => [
  { label: 'Position', ...yesNo(live.positionKnown, { yes: 'known', no: 'not known' }) },
  { label: 'Interlock', ...yesNo(live.interlockClosed, { yes: 'closed', no: 'open' }) },
  { label: 'Supply', ...yesNo(live.supplyPresent, { yes: 'present', no: 'lost' }) },
  { label: 'Drivers', ...yesNo(live.driversOn, { yes: 'on', no: 'off' }) },
];

const marks = {
  good: { icon: 'passed', tone: 'good' },
  bad: { icon: 'warning', tone: 'danger' },
  unknown: { icon: 'other', tone: 'dim' },
} as const;

/** What the controller itself says: angle, whether it moves, and what motion depends on. */
export function LiveFacts({ live }: { live: RigLive }) {
  return (
    <View className="min-w-[150px] flex-1 gap-2">
      <View>
        <Label>Turntable</Label>
        <Num size={24} light testID="rig-angle">
          {formatDegrees(live.angleDeg)}
        </Num>
        <Label>{live.moving ? 'moving' : live.angleDeg === null ? 'angle not known' : 'at rest'}</Label>
      </View>
      <View className="gap-1 pt-1">
        {factsOf(live).map((fact) => (
          <View key={fact.label} className="flex-row items-center gap-2">
            <Icon name={marks[fact.state].icon} size={16} tone={marks[fact.state].tone} />
            <Body size={13}>
              <Body size={13} tone="dim">
                {fact.label}
              </Body>{' '}
              {fact.words}
            </Body>
          </View>
        ))}
      </View>
    </View>
  );
}
