import { useMemo } from 'react';
import { AllanPlot } from '@/components/charts';
import { Body, Section } from '@/components/ui';
import { residualAllan } from '@/shared/evaluation/residual-allan';
import type { FitCurve } from '@/shared/evaluation/result';
import { allanWords } from './evaluation-words';

/** What the fits leave of the data, over the time it is averaged for: whether it is white noise or something slower. */
export function AllanPanel({ curves }: { curves: readonly FitCurve[] }) {
  const points = useMemo(() => residualAllan(curves), [curves]);
  const words = allanWords(points);
  if (words === null) return null;
  return (
    <Section
      title="Allan deviation of the residuals"
      remark="Overlapping, all dwells together, bars ± u. Dashed: white noise as great as at the shortest time."
    >
      <AllanPlot points={points} words={words} />
      <Body testID="allan-words">{words}</Body>
    </Section>
  );
}
