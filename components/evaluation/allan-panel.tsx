import { useMemo, useState } from 'react';
import { View } from 'react-native';
import { AllanPlot } from '@/components/charts';
import { Body, Section, Select } from '@/components/ui';
import { residualAllan } from '@/shared/evaluation/residual-allan';
import type { FitCurve } from '@/shared/evaluation/result';
import type { DeviationKind } from '@/shared/statistics/allan';
import { allanWords } from './evaluation-words';

const kinds: readonly { value: DeviationKind; label: string; words: string }[] = [
  { value: 'allan', label: 'Overlapping Allan', words: '' },
  { value: 'modified', label: 'Modified Allan', words: ' White noise falls faster in it at first than what is nearly as fast.' },
  { value: 'hadamard', label: 'Overlapping Hadamard', words: ' A straight drift does not show in it.' },
  { value: 'total', label: 'Total', words: ' The surest at the longest times: each dwell goes on as its own mirror.' },
];

/** What the fits leave of the data, over the time it is averaged for: whether it is white noise or something slower. */
export function AllanPanel({ curves }: { curves: readonly FitCurve[] }) {
  const [kind, setKind] = useState<DeviationKind>('allan');
  const points = useMemo(() => residualAllan(curves, kind), [curves, kind]);
  const shown = kinds.find(({ value }) => value === kind);
  const words = allanWords(points);
  if (shown === undefined || (words === null && kind === 'allan')) return null;
  const name = `${shown.label} deviation`;
  return (
    <Section
      title="Allan deviation of the residuals"
      remark={`All dwells together, bars ± u. Dashed: white noise as great as at the shortest time.${shown.words}`}
    >
      <View className="max-w-[320px]">
        <Select label="Deviation" value={kind} options={kinds} onChange={setKind} testID="allan-kind" />
      </View>
      {words === null ? null : <AllanPlot points={points} words={words} name={name} />}
      <Body testID="allan-words">{words ?? 'The dwells are too short for it.'}</Body>
    </Section>
  );
}
