import { useState } from 'react';
import { Button, Field, FileButton, ProblemNotice, Sheet } from '@/components/ui';
import { checkDocumentText } from '@/shared/protocol/check';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { Finding } from '@/shared/protocol/finding';

/** Reads a protocol from a file or from pasted text; each thing that is wrong has its line and column or its path, and the text stays. */
export function ImportSheet({ onDocument, onClose }: { onDocument: (document: ProtocolDocument) => void; onClose: () => void }) {
  const [text, setText] = useState('');
  const [findings, setFindings] = useState<readonly Finding[]>([]);
  const read = (candidate: string) => {
    setText(candidate);
    const result = checkDocumentText(candidate);
    setFindings(result.findings);
    if (result.document === null) return;
    onDocument(result.document);
    onClose();
  };
  const shown = findings.slice(0, 20);
  return (
    <Sheet
      open
      title="Protocol from a file or text"
      onClose={onClose}
      testID="import-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label="Read this text"
          disabled={text.trim() === ''}
          onPress={() => read(text)}
          testID="import-read"
        />
      }
    >
      <FileButton icon="import" label="Choose a file" accept=".json,application/json" onText={read} testID="import-file" />
      <Field
        label="Or paste the text"
        value={text}
        onChange={setText}
        mono
        lines={9}
        placeholder='{"formatVersion": 1, "name": …'
        testID="import-text"
      />
      {shown.length === 0 ? null : (
        <ProblemNotice
          title="This is no protocol yet"
          detail={
            findings.length === 1
              ? 'One thing is wrong:'
              : `${findings.length} things are wrong${findings.length > shown.length ? ', the first 20' : ''}:`
          }
          errors={shown.map(({ path, message }) => ({ path: path ?? '', message }))}
        />
      )}
    </Sheet>
  );
}
