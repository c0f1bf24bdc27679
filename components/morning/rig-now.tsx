import { View } from 'react-native';
import { useLabQuery } from '@/components/api';
import { useNow } from '@/components/runs/use-now';
import { Body, Icon, Label, Panel, type IconName } from '@/components/ui';
import { getRig } from '@/shared/contracts/rigs';
import { mayGoIn, type MayGoIn } from '@/shared/morning/may-go-in';

const everyMs = 3000;
/** What was heard longer ago says nothing of now. */
const oldMs = 10_000;

const answers: Record<MayGoIn['answer'], { title: string; icon: IconName; tone: 'good' | 'danger' | 'lamp' }> = {
  yes: { title: 'Yes', icon: 'passed', tone: 'good' },
  no: { title: 'No', icon: 'stop', tone: 'danger' },
  unknown: { title: 'Not known', icon: 'warning', tone: 'lamp' },
};

/** May I go in? As things stand now, not as they stood when the run ended. */
export function RigNow({ rigId, timeZone }: { rigId: string; timeZone: string }) {
  const rig = useLabQuery(getRig, { params: { rigId }, everyMs });
  const nowMs = useNow(1000);
  if (rig.data === undefined && !rig.isError) return null;
  const stand: MayGoIn =
    rig.data === undefined || rig.isError || nowMs - rig.dataUpdatedAt > oldMs
      ? { answer: 'unknown', words: 'The server does not answer: go by what the rig itself shows.', facts: [] }
      : mayGoIn(rig.data.data, timeZone);
  const { title, icon, tone } = answers[stand.answer];
  return (
    <Panel edge={tone} className="gap-0.5 !py-2" testID="may-go-in">
      <View className="flex-row items-center gap-2">
        <Icon name={icon} size={18} tone={tone} />
        <Body strong className="min-w-0 shrink">
          May I go in? {title}
        </Body>
      </View>
      <Label tone="text">{stand.words}</Label>
      {stand.facts.length === 0 ? null : <Label testID="rig-now">{stand.facts.join(' · ')}</Label>}
    </Panel>
  );
}
