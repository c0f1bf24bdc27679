import { useMemo } from 'react';
import { View } from 'react-native';
import { Body, Label, Num } from '@/components/ui';
import { inputWords } from '@/shared/evaluation/input-words';
import { formatPercent } from '@/shared/lib/format-number';
import { budgetFirst, type MeasurementShare } from '@/shared/planning/budget-first';
import type { RigDocument } from '@/shared/rig/document';

const shown = 5;

/** Which measurement of the apparatus would help G most, before any night: by share, with what half its u would be worth. */
export function BudgetFirstPanel({ document }: { document: RigDocument }) {
  const budget = useMemo(() => budgetFirst(document), [document]);
  if (budget === null) return null;
  const { relativeU, measurements } = budget;
  const rest = measurements.length - shown;
  return (
    <View className="gap-3 rounded-panel border border-line p-4" testID="rig-budget">
      <Body strong>Which measurement would help most</Body>
      <Body>
        The stated u of this apparatus alone leave u(G) at {formatPercent(relativeU)} of G. Nights make the period and the decay time better
        known; all else takes a better measurement.
      </Body>
      <View role="list" className="gap-3">
        {measurements.slice(0, shown).map((one, index) => (
          <Measurement key={one.source} one={one} first={index === 0} />
        ))}
      </View>
      {rest > 0 ? <Label>{rest} more with smaller shares.</Label> : null}
    </View>
  );
}

function Measurement({ one: { inputs, relativeU, share, relativeUIfHalved }, first }: { one: MeasurementShare; first: boolean }) {
  return (
    <View role="listitem" className="gap-1">
      <View className="flex-row items-baseline justify-between gap-3">
        <Body strong={first} className="shrink">
          {inputs.map(inputWords).join(', ')}
        </Body>
        <Num strong={first}>{formatPercent(share)}</Num>
      </View>
      <View className="h-2 overflow-hidden rounded-full bg-panel2" aria-hidden>
        <View className={`h-2 rounded-full ${first ? 'bg-lamp' : 'bg-faint'}`} style={{ width: `${Math.max(0.6, share * 100)}%` }} />
      </View>
      <Label>
        Alone {formatPercent(relativeU)} of G. With half its u, u(G) becomes {formatPercent(relativeUIfHalved, 3)} of G.
      </Label>
    </View>
  );
}
