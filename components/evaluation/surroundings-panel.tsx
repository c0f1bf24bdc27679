import { View } from 'react-native';
import { Body, Label, Panel, Section } from '@/components/ui';
import type { EvaluationResult, RegressionResult } from '@/shared/evaluation/result';
import { UNIT_OF_G } from '@/shared/lib/format-number';
import { regressionWords } from './evaluation-words';
import { UncertainText } from './uncertain-text';

/** How the dwells go with each channel of the surroundings, and G with that part and without it. Nothing here is in the result. */
export function SurroundingsPanel({ result: { regressions } }: { result: EvaluationResult }) {
  if (regressions === undefined || regressions.length === 0) return null;
  return (
    <Section
      title="The surroundings"
      remark="Offered beside the result, never in it: nothing was taken off. Both lines use only the dwells in which the channel has samples."
    >
      <View className="flex-row flex-wrap gap-3" testID="surroundings">
        {regressions.map((one) => (
          <ChannelPanel key={one.channel} one={one} />
        ))}
      </View>
    </Section>
  );
}

function ChannelPanel({ one }: { one: RegressionResult }) {
  const { channel, coefficient, without, with: taken } = one;
  return (
    <Panel className="min-w-0 grow basis-[300px] gap-3" testID={`surroundings-${channel}`}>
      <View>
        <Body strong>{channel}</Body>
        <UncertainText {...coefficient} />
        <Label>{regressionWords(one)}</Label>
      </View>
      <Outcome label="as it is" of={without} />
      <Outcome label="that part taken off" of={taken} />
    </Panel>
  );
}

function Outcome({ label, of: { reversal_rad: reversal, G } }: { label: string; of: RegressionResult['with'] }) {
  return (
    <View>
      <Label>{label}</Label>
      {G === null ? (
        <UncertainText value={reversal.value * 1e3} u={reversal.u * 1e3} unit="mrad" />
      ) : (
        <UncertainText value={G.value} u={G.u} unit={UNIT_OF_G} />
      )}
    </View>
  );
}
