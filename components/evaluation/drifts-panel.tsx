import { View } from 'react-native';
import { Label, Section } from '@/components/ui';
import { driftWords } from '@/shared/evaluation/method-words';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { UncertainText } from './uncertain-text';

/** Near minus far with the drift taken off in each way: they should agree, and how far they do not is what the drift makes of it. */
export function DriftsPanel({ result: { drifts } }: { result: EvaluationResult }) {
  if (drifts === undefined || drifts.length < 2) return null;
  return (
    <Section title="Drift taken off otherwise" remark="Near − far of the same dwells. The result keeps to the way that was registered.">
      <View role="list" testID="drifts">
        {drifts.map(({ drift, reversal_rad: { value, u } }) => (
          <View key={drift} role="listitem" className="flex-row flex-wrap items-baseline justify-between gap-x-4 py-2">
            <Label size={15}>{driftWords(drift)}</Label>
            <UncertainText value={value * 1e3} u={u === null ? null : u * 1e3} unit="mrad" />
          </View>
        ))}
      </View>
    </Section>
  );
}
