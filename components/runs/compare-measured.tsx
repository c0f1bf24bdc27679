import type { ReactNode } from 'react';
import { View } from 'react-native';
import { UncertainText } from '@/components/evaluation/uncertain-text';
import { Body, Label, Panel, Section } from '@/components/ui';
import type { MorningSheet } from '@/shared/contracts/morning';
import type { RunView } from '@/shared/contracts/runs';
import { formatReading } from '@/shared/lib/format-angle';
import { formatSignificant, UNIT_OF_G } from '@/shared/lib/format-number';
import { dwellWords } from '@/shared/morning/words';
import { compareMeasured, compareRooms, type ComparedValue } from '@/shared/morning/run-comparison';

export interface ComparedSide {
  run: RunView;
  sheet: { sheet: MorningSheet | null; why: string };
}

/** By how many standard uncertainties of the difference two values may differ before it is marked (k = 2). */
const MARKED_U = 2;

/** What both runs came to, and by how many standard uncertainties they differ. */
export function MeasuredPanel({ one, other }: { one: ComparedSide; other: ComparedSide }) {
  const [a, b] = [one.sheet.sheet, other.sheet.sheet];
  const values = a === null || b === null ? [] : compareMeasured(a, b);
  const rooms = a === null || b === null ? [] : compareRooms(a, b);
  return (
    <Section title="What was measured" remark="By the newest evaluation of each run.">
      <Panel className="gap-4" testID="compare-measured">
        <Pair label="mass set" texts={[one.run.massSetLabel, other.run.massSetLabel]} />
        <Pair label="operator" texts={[one.run.operator, other.run.operator]} />
        <Pair label="dwells" texts={[dwellsOf(one), dwellsOf(other)]} />
        {values.map((value) => (
          <Value key={value.label} value={value} />
        ))}
        {values.length > 0 || a === null || b === null ? null : <Label>Neither run was evaluated.</Label>}
        {rooms.map(({ name, unit, one: first, other: second }) => (
          <Pair key={`${name} ${unit}`} label={`${name}, least to greatest`} texts={[first, second].map((span) => spanText(span, unit))} />
        ))}
      </Panel>
    </Section>
  );
}

const dwellsOf = ({ sheet: { sheet, why } }: ComparedSide): string => (sheet === null ? `the morning sheet ${why}` : dwellWords(sheet));

const spanText = (span: { least: number; greatest: number } | null, unit: string): string =>
  span === null ? 'none' : `${formatReading(span.least, unit)} to ${formatReading(span.greatest, unit)}`;

function Pair({ label, texts }: { label: string; texts: readonly string[] }) {
  return (
    <View>
      <Label>{label}</Label>
      <View className="flex-row flex-wrap gap-x-8 gap-y-1">
        {texts.map((text, index) => (
          <Side key={index} index={index}>
            <Body>{text === '' ? '–' : text}</Body>
          </Side>
        ))}
      </View>
    </View>
  );
}

/** One of the two, named for whoever does not see that it stands left or right. */
function Side({ index, children }: { index: number; children: ReactNode }) {
  return (
    <View className="min-w-[150px] flex-1 flex-row items-baseline gap-2">
      <Label>{index === 0 ? '1st' : '2nd'}</Label>
      <View className="min-w-0 shrink">{children}</View>
    </View>
  );
}

const scales: Record<string, { factor: number; unit: string; exponent?: number }> = {
  rad: { factor: 1e3, unit: 'mrad', exponent: 0 },
  'rad/h': { factor: 1e6, unit: 'µrad/h', exponent: 0 },
  'm3.kg-1.s-2': { factor: 1, unit: UNIT_OF_G, exponent: -11 },
};

function Value({ value: { label, unit, one, other, inU } }: { value: ComparedValue }) {
  const { factor, unit: shown, exponent } = scales[unit] ?? { factor: 1, unit };
  const marked = inU !== null && inU > MARKED_U;
  return (
    <View testID={`compared-${label.replaceAll(/[^a-z]+/gi, '-')}`}>
      <Label>{label}</Label>
      <View className="flex-row flex-wrap gap-x-8 gap-y-1">
        {[one, other].map((side, index) => (
          <Side key={index} index={index}>
            {side === null ? (
              <Body>–</Body>
            ) : (
              <UncertainText
                size={15}
                value={side.value * factor}
                u={side.u === null ? null : side.u * factor}
                unit={shown}
                options={exponent === undefined ? {} : { exponent }}
              />
            )}
          </Side>
        ))}
      </View>
      {inU === null ? null : (
        <Body size={13} tone={marked ? 'lamp' : 'dim'} strong={marked}>
          {`differ by ${formatSignificant(inU, 2)} u of the difference${marked ? ', more than two' : ''}`}
        </Body>
      )}
    </View>
  );
}
