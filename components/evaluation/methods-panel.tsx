import { View } from 'react-native';
import { Body, Icon, Label, Section } from '@/components/ui';
import { sameSamplesWords } from '@/shared/evaluation/method-words';
import type { EvaluationResult, MethodResult } from '@/shared/evaluation/result';
import { formatPercent, UNIT_OF_G } from '@/shared/lib/format-number';
import { agreementOf, enWords, methodWords } from './evaluation-words';
import { UncertainText } from './uncertain-text';

/** G by each method, with u of each, and whether the others agree with the one of the result. */
export function MethodsPanel({ result }: { result: EvaluationResult }) {
  const { methods } = result;
  if (methods === undefined || methods.length === 0) return null;
  return (
    <Section
      title="Methods beside each other"
      remark={`From the same dwells. The u of a difference leaves out what the methods share of the rig: an error of a length or a mass moves them alike. ${sameSamplesWords}`}
    >
      <View role="list" testID="methods">
        {methods.map((one, index) => (
          <MethodLine key={one.method} one={one} chosen={one.method === result.method} last={index === methods.length - 1} />
        ))}
      </View>
    </Section>
  );
}

function MethodLine({ one, chosen, last }: { one: MethodResult; chosen: boolean; last: boolean }) {
  const { method, G, relativeU, En, why } = one;
  return (
    <View role="listitem" className={`gap-1 py-3 ${last ? '' : 'border-b border-line'}`} testID={`method-${method}`}>
      <View className="flex-row flex-wrap items-baseline justify-between gap-x-4">
        <Body strong={chosen}>{methodWords(method)}</Body>
        {G === null ? null : <UncertainText value={G.value} u={G.u} unit={UNIT_OF_G} />}
      </View>
      {G === null ? (
        <Label tone="text">No G by this method: {why ?? 'no reason given'}.</Label>
      ) : (
        <Label>
          {relativeU === null ? 'no uncertainty' : `u ${formatPercent(relativeU)} of G`}; {enWords(En)}
        </Label>
      )}
      {chosen ? <Label>The result above is by this method.</Label> : <Agreement one={one} />}
    </View>
  );
}

function Agreement({ one: { difference } }: { one: MethodResult }) {
  if (difference === null) return null;
  const { agrees, words } = agreementOf(difference);
  return (
    <View className="flex-row items-start gap-2">
      <Icon
        name={agrees === false ? 'warning' : agrees ? 'tick' : 'note'}
        size={16}
        tone={agrees === false ? 'lamp' : agrees ? 'good' : 'dim'}
      />
      <Label tone={agrees === false ? 'text' : 'dim'} className="min-w-0 flex-1">
        {words}
      </Label>
    </View>
  );
}
