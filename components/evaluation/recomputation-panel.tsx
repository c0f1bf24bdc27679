import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Label, Num, ProblemNotice } from '@/components/ui';
import type { ListedEvaluation } from '@/shared/contracts/evaluations';
import { compareResults, isMeasured, type ComparedValue, type ResultDifference } from '@/shared/evaluation/compare-results';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { formatExact, formatUncertain } from '@/shared/lib/format-uncertain';
import type { RigDocument } from '@/shared/rig/document';
import { softwareWords } from './evaluation-words';

interface RecomputationPanelProps {
  frozen: ListedEvaluation;
  recomputation: ListedEvaluation;
  /** As it was evaluated. */
  rig: RigDocument;
}

/** What came out when a frozen evaluation was computed again, place by place where it differs. */
export function RecomputationPanel({ frozen, recomputation, rig }: RecomputationPanelProps) {
  const { timeZone } = useLab();
  if (recomputation.state === 'failed')
    return <ProblemNotice title="It could not be computed again" detail={recomputation.error ?? 'No reason was given.'} />;
  if (frozen.result === null || recomputation.result === null)
    return (
      <View role="status" aria-live="polite">
        <Label>Being computed again. It goes on if you leave this page.</Label>
      </View>
    );
  const differences = compareResults(frozen.result, recomputation.result, rig);
  return (
    <View className="gap-2" testID="comparison">
      <Body strong>{differences.length === 0 ? 'No difference' : headOf(differences)}</Body>
      <Label>
        Computed again {formatDayAndClock(Date.parse(recomputation.createdAt), timeZone)} by {recomputation.createdBy}.{' '}
        {softwareWords(recomputation.software)}.
      </Label>
      {differences.map((difference) => (
        <DifferenceLine key={difference.path} difference={difference} />
      ))}
    </View>
  );
}

function headOf(differences: readonly ResultDifference[]): string {
  const places = differences.length === 1 ? 'One place differs' : `${differences.length} places differ`;
  return differences[0]?.path === 'G' ? `G differs. ${places} in all` : `G is the same. ${places}`;
}

function DifferenceLine({ difference: { path, unit, before, after, change } }: { difference: ResultDifference }) {
  return (
    <View className="border-t border-line pt-2">
      <Label className="break-all font-mono">{path}</Label>
      <Num size={13}>
        {wordsOfValue(before, unit)} → {wordsOfValue(after, unit)}
      </Num>
      {change === null ? null : <Label>difference {changeWords(change, unit)}</Label>}
    </View>
  );
}

function wordsOfValue(value: ComparedValue, unit: string): string {
  if (value === null) return 'nothing';
  if (isMeasured(value)) return formatUncertain({ ...value, unit });
  return typeof value === 'boolean' ? (value ? 'yes' : 'no') : value;
}

const changeWords = (change: number, unit: string): string =>
  change === 0 ? 'in u alone' : formatExact({ value: change, unit }, { signed: true });
