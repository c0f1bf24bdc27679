import { View } from 'react-native';
import { Body, Icon, Label, Num, Panel, type IconName } from '@/components/ui';
import type { MorningSheet, MorningTick } from '@/shared/contracts/morning';
import { lostWords, dwellsIn } from '@/shared/morning/words';

const marks: Record<'yes' | 'no' | 'open', { icon: IconName; tone: 'good' | 'danger' | 'dim'; said: string }> = {
  yes: { icon: 'tick', tone: 'good', said: 'right' },
  no: { icon: 'failed', tone: 'danger', said: 'wrong' },
  open: { icon: 'note', tone: 'dim', said: 'not known' },
};

/** Five ticks, each with its figure. */
export function Believe({ ticks }: { ticks: readonly MorningTick[] }) {
  return (
    <View role="list" aria-label="Believe it?" className="gap-1" testID="ticks">
      {ticks.map(({ code, ok, words }) => {
        const { icon, tone, said } = marks[ok === null ? 'open' : ok ? 'yes' : 'no'];
        return (
          <View key={code} role="listitem" className="flex-row items-start gap-2" testID={`tick-${code}`}>
            <Icon name={icon} size={16} tone={tone} label={said} />
            <Label tone={ok === false ? 'text' : 'dim'} className="min-w-0 shrink">
              {words}
            </Label>
          </View>
        );
      })}
    </View>
  );
}

/** How many dwells are good, and where the rest of the time went. */
export function GoodDwells({ dwells, lost }: Pick<MorningSheet, 'dwells' | 'lost'>) {
  const { total, causes } = lostWords(lost);
  return (
    <View className="gap-0.5" testID="good-dwells">
      <Body>
        <Num size={17}>
          {dwells.good} of {dwellsIn(dwells)}
        </Num>{' '}
        dwells are good{causes === '' ? ', ' : '; '}
        {total}
      </Body>
      {causes === '' ? null : <Label>{causes}</Label>}
    </View>
  );
}

/** The night in figures that say whether to believe it. */
export function NightFigures({ sheet }: { sheet: MorningSheet }) {
  return (
    <Panel className="gap-2 !py-3" testID="figures">
      <Believe ticks={sheet.ticks} />
      <GoodDwells {...sheet} />
    </Panel>
  );
}
