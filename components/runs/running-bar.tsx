import { Link, usePathname, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLabQuery } from '@/components/api';
import { Body, Icon, Label } from '@/components/ui';
import { listRuns, type RunSummary } from '@/shared/contracts/runs';
import { isOver, stateMark, stateWord } from './run-words';

const everyMs = 5000;

/** On every screen: which rigs are running or held, each leading back to its run. Nothing where nothing runs, or on that run's own screen. */
export function RunningBar() {
  const pathname = usePathname();
  const { data } = useLabQuery(listRuns, { query: { active: 'true', limit: 20 }, everyMs });
  const runs = (data?.data.items ?? []).filter((run) => !run.rehearsal && !isOver(run.state) && pathname !== `/runs/${run.id}`);
  if (runs.length === 0) return null;
  return (
    <View role="navigation" aria-label="Running now" className="flex-none border-b border-line bg-panel2" testID="running-bar">
      {runs.map((run) => (
        <RunningLine key={run.id} run={run} />
      ))}
    </View>
  );
}

function RunningLine({ run }: { run: RunSummary }) {
  const mark = stateMark(run.state);
  return (
    <Link
      href={`/runs/${run.id}` as Href}
      className="min-h-target flex-row items-center gap-3 px-4 py-1 hover:bg-panel wide:px-7"
      style={{ display: 'flex', flexDirection: 'row' }}
    >
      <Icon name={mark.icon} size={18} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
      <Body strong numberOfLines={1} className="shrink">
        {run.rigName}
      </Body>
      <Label numberOfLines={1} className="shrink grow">
        {stateWord(run.state).toLowerCase()}, {run.protocolName}
      </Label>
      <Icon name="forward" size={18} tone="dim" />
    </Link>
  );
}
