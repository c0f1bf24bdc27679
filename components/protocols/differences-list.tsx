import { View } from 'react-native';
import { Body, Label } from '@/components/ui';
import { compareDocuments } from '@/shared/protocol/compare';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { differenceWords } from './difference-words';

const marks = { added: { sign: '+', tone: 'good' }, removed: { sign: '−', tone: 'danger' }, changed: { sign: '≠', tone: 'lamp' } } as const;

/** What differs from the first document to the second: sign, place, before and after. */
export function DifferencesList({ before, after }: { before: ProtocolDocument; after: ProtocolDocument }) {
  const differences = compareDocuments(before, after).map(differenceWords);
  if (differences.length === 0) return <Label testID="no-differences">They are the same.</Label>;
  return (
    <View testID="differences">
      {differences.map((difference, index) => (
        <View key={`${index} ${difference.where}`} className={`flex-row gap-3 py-2.5 ${index === 0 ? '' : 'border-t border-line'}`}>
          <Body strong tone={marks[difference.mark].tone} className="w-5 text-center font-mono" aria-hidden>
            {marks[difference.mark].sign}
          </Body>
          <View className="min-w-0 flex-1">
            <Label>
              {difference.where}, {difference.mark}
            </Label>
            {difference.before === '' ? null : (
              <Body tone="dim">{difference.mark === 'changed' ? `was ${difference.before}` : difference.before}</Body>
            )}
            {difference.after === '' ? null : <Body>{difference.mark === 'changed' ? `is ${difference.after}` : difference.after}</Body>}
          </View>
        </View>
      ))}
    </View>
  );
}
