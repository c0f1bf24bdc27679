import { useState } from 'react';
import { Button, Field, FileButton, Label, ProblemNotice, Sheet } from '@/components/ui';
import type { RigDocument } from '@/shared/rig/document';
import { readRigText, type TextProblem } from './read-rig-text';

/** Takes a rig document from a file or pasted text into the draft; what is wrong is named with its place, and the text stays. */
export function RigImportSheet({
  onDocument,
  onClose,
  title = 'Import a rig document',
}: {
  onDocument: (document: RigDocument) => void;
  onClose: () => void;
  title?: string;
}) {
  const [text, setText] = useState('');
  const [problems, setProblems] = useState<TextProblem[]>([]);
  const take = (candidate: string) => {
    setText(candidate);
    const read = readRigText(candidate);
    if (read.document === null) return setProblems(read.problems);
    onDocument(read.document);
    onClose();
  };
  return (
    <Sheet
      open
      title={title}
      onClose={onClose}
      footer={
        <Button
          kind="primary"
          size="action"
          label="Read this text"
          disabled={text.trim() === ''}
          onPress={() => take(text)}
          testID="rig-import-read"
        />
      }
    >
      <FileButton icon="import" label="Choose a file" accept=".json,application/json" onText={take} testID="rig-import-file" />
      <Field
        label="Or paste the text"
        value={text}
        onChange={setText}
        mono
        lines={8}
        placeholder='{"pendulum": …'
        testID="rig-import-text"
      />
      <Label>It replaces every value in the draft; you see all differences before a revision is made.</Label>
      {problems.length === 0 ? null : (
        <ProblemNotice
          title="This is no rig document"
          detail={`${problems.length === 1 ? 'One thing is' : `${problems.length} things are`} wrong:`}
          errors={problems.slice(0, 20)}
        />
      )}
    </Sheet>
  );
}
