import { View } from 'react-native';
import { GScale } from '@/components/charts';
import { Body, Icon, Label, Num, Panel } from '@/components/ui';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { formatPercent, formatSignificant, UNIT_OF_G } from '@/shared/lib/format-number';
import { enWords, freedomWords, methodWords } from './evaluation-words';
import { LargeG } from './uncertain-text';

interface GPanelProps {
  result: EvaluationResult;
  /** `as registered`, or how it differs. */
  registered: { words: string; differs: boolean };
  /** The simulator's G, for a rehearsal. */
  trueG?: number | null;
  heading: string;
}

/** G with its uncertainty, where it lies beside the recommended value (or a simulator's true one), and whether it was decided before it was seen. */
export function GPanel({ result, registered, trueG = null, heading }: GPanelProps) {
  const { G, codata, relativeU } = result;
  if (G === null) {
    return (
      <Panel className="gap-2" testID="g-panel">
        <Label>{heading}</Label>
        <Body>No G from these dwells: without a near and a far dwell next to one another there is no difference to measure.</Body>
      </Panel>
    );
  }
  return (
    <Panel className="gap-3" testID="g-panel">
      <Label>
        {heading}, {methodWords(result.method)}
      </Label>
      <LargeG value={G.value} u={G.u} unit={UNIT_OF_G} testID="g-value" />
      <View className="gap-0.5">
        <Label>
          {relativeU === null ? 'no uncertainty' : `standard uncertainty in brackets, ${formatPercent(relativeU)} of G`}
          {G.degreesOfFreedom === null ? '' : `, ${freedomWords(G.degreesOfFreedom)}`}
        </Label>
        {trueG === null ? <Label testID="en">{enWords(codata.En)}</Label> : <TrueG value={G.value} u={G.u} trueG={trueG} />}
      </View>
      <GScale value={G.value} u={G.u} codata={codata} other={trueG === null ? undefined : { value: trueG, label: 'true G' }} />
      <View className="flex-row items-center gap-2">
        <Icon name={registered.differs ? 'warning' : 'document'} size={16} tone={registered.differs ? 'lamp' : 'dim'} />
        <Label tone={registered.differs ? 'text' : 'dim'} className="shrink" testID="registered">
          {registered.words}
        </Label>
      </View>
    </Panel>
  );
}

/** A rehearsal knows what it should have found. */
function TrueG({ value, u, trueG }: { value: number; u: number | null; trueG: number }) {
  const off = value - trueG;
  const sigmas = u === null || u === 0 ? null : Math.abs(off) / u;
  return (
    <Label testID="true-g">
      true G of the simulator is <Num size={13}>{formatSignificant(trueG * 1e11, 6)}</Num> × 10⁻¹¹ {UNIT_OF_G}; found{' '}
      {off < 0 ? 'below' : 'above'} it by {formatPercent(Math.abs(off / trueG))}
      {sigmas === null ? '' : `, ${formatSignificant(sigmas, 2)} u`}
    </Label>
  );
}
