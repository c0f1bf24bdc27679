import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabMutation } from '@/components/api';
import { Body, Field, Label, ReasonSheet } from '@/components/ui';
import { makeExclusion, withdrawExclusion, type ExclusionView } from '@/shared/contracts/exclusions';
import { zoneName } from '@/shared/lib/format-time';
import { partOf, stretchWords, wholeOf, type Stretch } from './stretch';

interface ExcludeSheetProps {
  runId: string;
  /** The stretch whose samples are to be excluded, or a part of them. */
  step: Stretch;
  /** What the stretch is, as in `the beginning of the step`. */
  of?: string;
  title: string;
  onClose: () => void;
  onDone: () => void;
}

/** Excludes a step, or whatever was marked, or a part of it: from when to when, and why. */
export function ExcludeSheet({ runId, step, of = 'the step', title, onClose, onDone }: ExcludeSheetProps) {
  const { timeZone } = useLab();
  const [typed, setTyped] = useState(() => wholeOf(step));
  const exclude = useLabMutation(makeExclusion, () => {
    onDone();
    onClose();
  });
  const { stretch, errors } = partOf(step, typed);
  return (
    <ReasonSheet
      title={title}
      act="Exclude"
      keptIn="in the archive and in the audit trail"
      sending={exclude}
      failed="It was not excluded"
      ready={stretch !== null}
      onSend={(reason) => stretch !== null && exclude.mutate({ params: { runId }, body: { ...stretch, reason } })}
      onClose={onClose}
      testID="exclude"
    >
      <Body tone="dim">
        Evaluations from now on do without these samples, and say so. A dwell that loses more than half of its samples does not count.
        Nothing is deleted: it can be withdrawn at any time.
      </Body>
      <View className="flex-row gap-3">
        <View className="min-w-0 flex-1">
          <Field
            label="From"
            type="number"
            unit="s"
            value={typed.from}
            onChange={(from) => setTyped({ ...typed, from })}
            error={errors?.from}
            testID="exclude-from"
          />
        </View>
        <View className="min-w-0 flex-1">
          <Field
            label="To"
            type="number"
            unit="s"
            value={typed.to}
            onChange={(to) => setTyped({ ...typed, to })}
            error={errors?.to}
            testID="exclude-to"
          />
        </View>
      </View>
      <Label>
        {stretch === null
          ? `Seconds after the beginning of ${of}.`
          : `Seconds after the beginning of ${of}: ${stretchWords(stretch, timeZone)}, ${zoneName(timeZone)}.`}
      </Label>
    </ReasonSheet>
  );
}

/** Withdraws an exclusion, with a reason. */
export function WithdrawSheet({ exclusion, onClose, onDone }: { exclusion: ExclusionView; onClose: () => void; onDone: () => void }) {
  const { timeZone } = useLab();
  const withdraw = useLabMutation(withdrawExclusion, () => {
    onDone();
    onClose();
  });
  return (
    <ReasonSheet
      title="Withdraw the exclusion"
      act="Withdraw"
      keptIn="here and in the audit trail"
      sending={withdraw}
      failed="It was not withdrawn"
      onSend={(reason) => withdraw.mutate({ params: { exclusionId: exclusion.id }, body: { reason } })}
      onClose={onClose}
      testID="withdraw"
    >
      <Body tone="dim">
        Evaluations from now on use the samples of {stretchWords(exclusion, timeZone)} again. The exclusion stays listed as withdrawn.
      </Body>
    </ReasonSheet>
  );
}
