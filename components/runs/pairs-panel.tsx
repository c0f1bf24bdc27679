import { View } from 'react-native';
import { useLabQuery } from '@/components/api';
import { Body, Icon, Label, Panel, Section } from '@/components/ui';
import type { StepRowView } from '@/shared/contracts/runs';
import { listEvents } from '@/shared/contracts/runs';
import { formatClock } from '@/shared/lib/format-time';
import { pairsOf } from './pairs';

interface PairsPanelProps {
  runId: string;
  rows: readonly StepRowView[];
  timeZone: string;
}

/** Which pairs count, and why the others do not. */
export function PairsPanel({ runId, rows, timeZone }: PairsPanelProps) {
  const events = useLabQuery(listEvents, { params: { runId }, query: { kind: 'dwell-not-good', limit: 500 } });
  const pairs = pairsOf(rows);
  if (pairs.length === 0) return null;
  const counting = pairs.filter(({ counts }) => counts).length;
  const reasons = new Map((events.data?.data.items ?? []).map(({ data }) => [data['seq'], data['why']]));
  const bad = rows.filter((row) => row.kind === 'dwell' && row.good === false);
  return (
    <Section title="Pairs">
      <Panel className="gap-3" testID="pairs">
        <Body>
          {counting} of {pairs.length} {pairs.length === 1 ? 'pair counts' : 'pairs count'}
          {bad.length === 0 ? '.' : '; left out by what was fixed beforehand:'}
        </Body>
        {bad.map((row) => (
          <View key={row.seq} className="flex-row items-start gap-3">
            <Icon name="warning" tone="lamp" size={18} />
            <View className="min-w-0 shrink">
              <Body>
                {row.station === '' ? 'Dwell' : `${row.station} dwell`} of {formatClock(row.startUtcMs, { timeZone })}
              </Body>
              <Label>{whyWords(reasons.get(row.seq))}</Label>
            </View>
          </View>
        ))}
      </Panel>
    </Section>
  );
}

function whyWords(why: unknown): string {
  return Array.isArray(why) && why.length > 0 ? why.map(String).join('; ') : 'the log tells why';
}
