import { View } from 'react-native';
import { Body, Label, Panel, Section } from '@/components/ui';
import type { MorningSheet } from '@/shared/contracts/morning';
import { formatReading } from '@/shared/lib/format-angle';
import { formatUncertain } from '@/shared/lib/format-uncertain';

/** What the room did, and what of it went in step with the swings: only that can look like near minus far. */
export function Room({ room }: Pick<MorningSheet, 'room'>) {
  if (room.length === 0) return null;
  return (
    <Section title="Room">
      <Panel className="gap-3" testID="room">
        {room.map(({ name, unit, least, greatest, inStep }) => (
          <View key={name}>
            <Body>
              {name}: {formatReading(least, unit)} to {formatReading(greatest, unit)}
            </Body>
            <Label>
              {inStep === null
                ? 'what goes in step with the swings cannot be told: too few dwells in turn have samples'
                : `${formatUncertain({ ...inStep, unit })} in step with the swings, near − far${goesAlong(inStep) ? ': look at the comparison in the evaluation' : ''}`}
            </Label>
          </View>
        ))}
      </Panel>
    </Section>
  );
}

/** Beyond what scatter makes plausible (k = 2). */
const goesAlong = ({ value, u }: { value: number; u: number | null }) => u !== null && Math.abs(value) > 2 * u;
