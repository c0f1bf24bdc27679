import { useState } from 'react';
import { View } from 'react-native';
import { Field, Label, Select } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';
import type { ClockChoice } from '@/shared/evaluation/clock-choice';
import type { EvaluationResult } from '@/shared/evaluation/result';

type Alignment = EvaluationResult['alignment'];

const ways = [
  { value: 'estimated', label: 'As the data tell it' },
  { value: 'left', label: 'Left as it is' },
  { value: 'set', label: 'Set by hand' },
] as const;
type Way = (typeof ways)[number]['value'];

/** What is to become of the channel's clock when the run is evaluated again: begun with what was decided last. */
export function useClockChoice(last: Alignment) {
  const decided = last?.decided;
  const [way, setWay] = useState<Way>(decided?.kind ?? 'estimated');
  const [text, setText] = useState(decided?.kind === 'set' ? String(decided.offset_s) : '');
  const [error, setError] = useState<string | undefined>(undefined);
  /** Null, with the reason shown, where the number cannot be read. */
  const read = (): ClockChoice | null => {
    setError(undefined);
    if (way !== 'set') return { kind: way };
    const offset_s = readDecimal(text);
    if (offset_s !== null && Math.abs(offset_s) <= 86_400) return { kind: 'set', offset_s };
    setError('A number of seconds within a day is needed, 0.35 say');
    return null;
  };
  return { way, setWay, text, setText, error, read };
}

/** Accept, leave or correct how the channel's clock stands against the step log's. */
export function ClockChooser({ way, setWay, text, setText, error }: Omit<ReturnType<typeof useClockChoice>, 'read'>) {
  return (
    <View className="gap-3">
      <View className="flex-row flex-wrap items-start gap-3">
        <View className="min-w-[220px] flex-1">
          <Select label="Clock of the channel" value={way} options={ways} onChange={setWay} testID="clock-way" />
        </View>
        {way === 'set' ? (
          <View className="min-w-[220px] flex-1">
            <Field label="Ahead of the step log by, s" value={text} onChange={setText} error={error} mono testID="clock-offset" />
          </View>
        ) : null}
      </View>
      {way === 'estimated' ? null : <Label>The result says that this was decided, and what G would be otherwise.</Label>}
    </View>
  );
}
