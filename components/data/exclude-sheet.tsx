import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, useLab, useLabMutation, wordsOf } from '@/components/api';
import { Body, Button, Field, Label, ProblemNotice, Sheet } from '@/components/ui';
import { makeExclusion, withdrawExclusion, type ExclusionView } from '@/shared/contracts/exclusions';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import { lengthS, partOf, wholeOf, type Stretch } from './stretch';

/** Clock times of a stretch and how long it is. */
export function stretchWords(stretch: Stretch, timeZone: string): string {
  const clock = (utcMs: number) => formatClock(utcMs, { timeZone, precision: 'seconds' });
  return `${clock(stretch.startUtcMs)} to ${clock(stretch.endUtcMs)}, ${formatDuration(lengthS(stretch))}`;
}

interface ExcludeSheetProps {
  runId: string;
  /** The step whose samples are to be excluded, or a part of them. */
  step: Stretch;
  title: string;
  onClose: () => void;
  onDone: () => void;
}

/** Excludes a step or a part of it: from when to when, and why. */
export function ExcludeSheet({ runId, step, title, onClose, onDone }: ExcludeSheetProps) {
  const { timeZone } = useLab();
  const [typed, setTyped] = useState(() => wholeOf(step));
  const [reason, setReason] = useState('');
  const exclude = useLabMutation(makeExclusion, () => {
    onDone();
    onClose();
  });
  const { stretch, errors } = partOf(step, typed);
  const said = reason.trim();
  return (
    <Sheet
      open
      title={title}
      onClose={onClose}
      testID="exclude-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label="Exclude"
          busy={exclude.isPending}
          disabled={stretch === null || said.length < 3}
          onPress={() => stretch !== null && exclude.mutate({ params: { runId }, body: { ...stretch, reason: said } })}
          testID="exclude-send"
        />
      }
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
          ? 'Seconds after the beginning of the step.'
          : `Seconds after the beginning of the step: ${stretchWords(stretch, timeZone)}, ${zoneName(timeZone)}.`}
      </Label>
      <Field
        label="Why"
        value={reason}
        onChange={setReason}
        error={fieldErrors(exclude.error)['reason']}
        hint="In a few words; kept with your name, in the archive and in the audit trail."
        testID="exclude-reason"
      />
      {exclude.isError ? <ProblemNotice title="It was not excluded" {...wordsOf(exclude.error)} /> : null}
    </Sheet>
  );
}

/** Withdraws an exclusion, with a reason. */
export function WithdrawSheet({ exclusion, onClose, onDone }: { exclusion: ExclusionView; onClose: () => void; onDone: () => void }) {
  const { timeZone } = useLab();
  const [reason, setReason] = useState('');
  const withdraw = useLabMutation(withdrawExclusion, () => {
    onDone();
    onClose();
  });
  const said = reason.trim();
  return (
    <Sheet
      open
      title="Withdraw the exclusion"
      onClose={onClose}
      testID="withdraw-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label="Withdraw"
          busy={withdraw.isPending}
          disabled={said.length < 3}
          onPress={() => withdraw.mutate({ params: { exclusionId: exclusion.id }, body: { reason: said } })}
          testID="withdraw-send"
        />
      }
    >
      <Body tone="dim">
        Evaluations from now on use the samples of {stretchWords(exclusion, timeZone)} again. The exclusion stays listed as withdrawn.
      </Body>
      <Field
        label="Why"
        value={reason}
        onChange={setReason}
        error={fieldErrors(withdraw.error)['reason']}
        hint="In a few words; kept with your name, here and in the audit trail."
        testID="withdraw-reason"
      />
      {withdraw.isError ? <ProblemNotice title="It was not withdrawn" {...wordsOf(withdraw.error)} /> : null}
    </Sheet>
  );
}
