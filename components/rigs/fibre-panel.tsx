import { View } from 'react-native';
import { Body, Icon, Label } from '@/components/ui';
import { fibreFacts, fibreWarnings, leastSafetyFactor } from '@/shared/physics/fibre';
import { formatUncertain } from '@/shared/lib/format-uncertain';
import type { RigDocument } from '@/shared/rig/document';

const kappaWords = (quantity: { value: number; u: number }) => formatUncertain({ ...quantity, unit: 'N m/rad' });

/** What the fibre's dimensions say beside the measured period, and how hard the pendulum pulls at it. */
export function FibrePanel({ document }: { document: RigDocument }) {
  const facts = fibreFacts(document);
  if (facts === null) return null;
  const { kappa, tensionKappa, periodKappa, stressPa } = facts;
  const needed = (leastSafetyFactor * stressPa) / 1e9;
  return (
    <View className="gap-2 rounded-panel border border-line p-4" testID="fibre">
      <Body strong>What the fibre bears and how it twists</Body>
      <Body>
        The pendulum pulls with {(stressPa / 1e9).toPrecision(3)} GPa, so the wire has to bear {needed.toPrecision(3)} GPa for a safety
        factor of {leastSafetyFactor}.
      </Body>
      {kappa === null ? null : (
        <Body>
          Torsion constant by the wire: {kappaWords(kappa)}
          {tensionKappa === null ? '' : `, and ${((100 * tensionKappa) / kappa.value).toPrecision(2)} % more by the tension`}.
        </Body>
      )}
      {periodKappa === null ? null : <Body>By the measured period: {kappaWords(periodKappa)}.</Body>}
      <Label>The wire is never used for G: its torsion constant goes with the fourth power of the diameter.</Label>
      {fibreWarnings(facts).map((warning) => (
        <View key={warning} className="flex-row items-start gap-2">
          <Icon name="warning" size={18} tone="lamp" />
          <Body className="min-w-0 flex-1">{warning}</Body>
        </View>
      ))}
    </View>
  );
}
