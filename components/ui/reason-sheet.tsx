import { useState, type ReactNode } from 'react';
import { fieldErrors, wordsOf } from '@/components/api/problem';
import { Button } from './button';
import { Field } from './field';
import { Sheet } from './sheet';
import { ProblemNotice } from './states';

/** Shorter says nothing; the server refuses it too. */
const shortestReason = 3;

interface ReasonSheetProps {
  title: string;
  /** What the button says. */
  act: string;
  /** Where the reason can be read afterwards, with the person's name. */
  keptIn: string;
  /** The call: whether it is under way, and what it failed with. */
  sending: { isPending: boolean; isError: boolean; error: unknown };
  /** Heading of the notice when it failed. */
  failed: string;
  /** Whether everything else that is asked for is right. */
  ready?: boolean;
  onSend: (reason: string) => void;
  onClose: () => void;
  /** `exclude` stands for `exclude-sheet`, `exclude-reason` and `exclude-send`. */
  testID: string;
  /** What happens, and what else is asked. */
  children: ReactNode;
}

/** A sheet for an act that is kept with a reason. */
export function ReasonSheet({ title, act, sending, failed, keptIn, ready = true, onSend, onClose, testID, children }: ReasonSheetProps) {
  const [reason, setReason] = useState('');
  const said = reason.trim();
  return (
    <Sheet
      open
      title={title}
      onClose={onClose}
      testID={`${testID}-sheet`}
      footer={
        <Button
          kind="primary"
          size="action"
          label={act}
          busy={sending.isPending}
          disabled={!ready || said.length < shortestReason}
          onPress={() => onSend(said)}
          testID={`${testID}-send`}
        />
      }
    >
      {children}
      <Field
        label="Why"
        value={reason}
        onChange={setReason}
        error={fieldErrors(sending.error)['reason']}
        hint={`In a few words; kept with your name, ${keptIn}.`}
        testID={`${testID}-reason`}
      />
      {sending.isError ? <ProblemNotice title={failed} {...wordsOf(sending.error)} /> : null}
    </Sheet>
  );
}
