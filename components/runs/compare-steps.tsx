import { useMemo, useState } from 'react';
import { View } from 'react-native';
import { Body, Button, Label, Num, Panel, Section, Tabs } from '@/components/ui';
import type { StepRowView } from '@/shared/contracts/runs';
import { formatDelay, formatDuration } from '@/shared/lib/format-duration';
import { compareSteps, type ComparedStep } from '@/shared/morning/run-comparison';
import { stepTitle, type TargetSource } from './run-words';

/** More than these are shown when asked for: two whole nights have thousands. */
const shownFirst = 60;

/** Where the step logs of two runs differ, step by step. */
export function ComparedSteps({
  one,
  other,
  protocol,
}: {
  one: readonly StepRowView[];
  other: readonly StepRowView[];
  protocol: TargetSource;
}) {
  const [all, setAll] = useState<'different' | 'all'>('different');
  const steps = useMemo(() => compareSteps(one, other), [one, other]);
  const different = steps.filter(({ differs }) => differs.length > 0);
  const shown = all === 'all' ? steps : different;
  const [limit, setLimit] = useState(shownFirst);
  return (
    <Section
      title="Steps"
      remark="The same: as often begun, the same outcome, as long within 1 s, at the same angle within 0.05°. Lengths and times are those of the last try."
    >
      <View className="flex-row flex-wrap items-center justify-between gap-3">
        <Label testID="compared-count">
          {different.length === 0 ? `All ${steps.length} steps are the same.` : `${different.length} of ${steps.length} steps differ.`}
        </Label>
        <View className="w-[220px]">
          <Tabs
            label="Steps shown"
            value={all}
            onChange={setAll}
            options={[
              { value: 'different', label: 'Different' },
              { value: 'all', label: 'All' },
            ]}
          />
        </View>
      </View>
      {shown.length === 0 ? null : (
        <Panel className="!py-1" testID="compared-steps">
          {shown.slice(0, limit).map((step, index) => (
            <StepPair key={step.path} step={step} protocol={protocol} first={index === 0} />
          ))}
        </Panel>
      )}
      {shown.length <= limit ? null : (
        <Button kind="quiet" label={`Show more of ${shown.length}`} onPress={() => setLimit(limit * 4)} testID="compared-more" />
      )}
    </Section>
  );
}

const lengthText = (row: StepRowView | null): string =>
  row === null ? '–' : row.endUtcMs === null ? 'under way' : formatDuration((row.endUtcMs - row.startUtcMs) / 1000);

function StepPair({ step, protocol, first }: { step: ComparedStep<StepRowView>; protocol: TargetSource; first: boolean }) {
  const { path, one, other, differs, shiftS, longerS } = step;
  const row = one ?? other;
  if (row === null) return null;
  return (
    <View className={`py-2.5 ${first ? '' : 'border-t border-line'}`}>
      <View className="flex-row flex-wrap items-baseline justify-between gap-x-4">
        <Body>{stepTitle({ ...row, outcome: null }, protocol)}</Body>
        <Label>{path}</Label>
      </View>
      <View className="flex-row flex-wrap items-baseline gap-x-6">
        <Label>
          length <Num size={13}>{lengthText(one)}</Num> and <Num size={13}>{lengthText(other)}</Num>
          {longerS === null || Math.abs(longerS) < 0.001 ? '' : ` (${formatDelay(longerS)})`}
        </Label>
        {shiftS === null || Math.abs(shiftS) < 1 ? null : (
          <Label>
            in the second <Num size={13}>{formatDelay(shiftS)}</Num> from its start
          </Label>
        )}
      </View>
      {differs.length === 0 ? null : <Body tone="lamp">{differs.join(', ')}</Body>}
    </View>
  );
}
