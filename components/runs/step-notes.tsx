import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Field, Label, ProblemNotice } from '@/components/ui';
import { listStepNotes, writeStepNote, type StepNoteView } from '@/shared/contracts/step-notes';
import { formatDayAndClock } from '@/shared/lib/format-time';

const none: readonly StepNoteView[] = [];

/** Notes to the rows of a run's step log, and what to call when one was written. */
export function useStepNotes(runId: string) {
  const query = useLabQuery(listStepNotes, { params: { runId } });
  return {
    notes: query.data?.data.items ?? none,
    error: query.isError ? wordsOf(query.error).detail : null,
    onChanged: () => void query.refetch(),
  };
}

export type StepNotes = ReturnType<typeof useStepNotes>;

interface RowNotesProps extends StepNotes {
  runId: string;
  seq: number;
}

/** The notes to one row, and a place to write the next. */
export function RowNotes({ runId, seq, notes, error, onChanged }: RowNotesProps) {
  const { timeZone } = useLab();
  const may = useMay('data.annotate');
  return (
    <View className="gap-3" testID="row-notes">
      {error === null ? null : (
        <ProblemNotice title="The notes could not be loaded" detail={error} action={{ label: 'Try again', onPress: onChanged }} />
      )}
      <View role="list" className="gap-3">
        {notes
          .filter((note) => note.seq === seq)
          .map((note) => (
            <View key={note.id} role="listitem" className="gap-0.5" testID="row-note">
              <Body size={15}>{note.text}</Body>
              <Label>
                {formatDayAndClock(Date.parse(note.at), timeZone)} by {note.by}
              </Label>
            </View>
          ))}
      </View>
      {may.ok ? <NewNote runId={runId} seq={seq} onWritten={onChanged} /> : <Label>{may.why}</Label>}
    </View>
  );
}

function NewNote({ runId, seq, onWritten }: { runId: string; seq: number; onWritten: () => void }) {
  const [text, setText] = useState('');
  const write = useLabMutation(writeStepNote, () => {
    setText('');
    onWritten();
  });
  const said = text.trim();
  return (
    <View className="gap-2">
      <Field
        label={`Note to step ${String(seq)}`}
        value={text}
        onChange={setText}
        lines={2}
        hint="Kept with your name and the time, here, in the archive and in the audit trail; it cannot be changed."
        testID="note-text"
      />
      {write.isError ? <ProblemNotice title="The note was not kept" {...wordsOf(write.error)} /> : null}
      <Button
        label="Keep the note"
        busy={write.isPending}
        disabled={said === ''}
        onPress={() => write.mutate({ params: { runId }, body: { seq, text: said } })}
        className="self-start"
        testID="note-send"
      />
    </View>
  );
}
