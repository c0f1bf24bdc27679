import { useState } from 'react';
import { Body, Button, Field, Label, ProblemNotice, Sheet } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';
import { withChange, type DocumentRow } from './document-rows';
import { quantityLine } from './quantity-words';
import { readRigDocument, type TextProblem } from './read-rig-text';
import type { RigDraft } from './use-rig-draft';

/** Changes one value and its uncertainty in the draft of the next revision. */
export function QuantitySheet({ row, draft, onClose }: { row: DocumentRow; draft: RigDraft; onClose: () => void }) {
  const [value, setValue] = useState(row.kind === 'words' ? '' : String(row.value));
  const [u, setU] = useState(row.kind === 'quantity' ? String(row.u) : '');
  const [problems, setProblems] = useState<TextProblem[]>([]);
  if (row.kind === 'words') return null;
  const read = { value: readDecimal(value), u: row.kind === 'quantity' ? readDecimal(u) : 0 };
  const uWrong = read.u === null || read.u < 0;
  const preview =
    read.value === null || read.u === null
      ? null
      : quantityLine(row.kind === 'quantity' ? { ...row, value: read.value, u: read.u } : { ...row, value: read.value });
  const accept = () => {
    if (read.value === null || read.u === null) return;
    const next = readRigDocument(
      withChange(draft.document, row.path, row.kind === 'quantity' ? { value: read.value, u: read.u } : { value: read.value }),
    );
    if (next.document === null) return setProblems(next.problems);
    draft.set(next.document);
    onClose();
  };
  const unit = row.unit === 'deg' ? '°' : row.unit;
  return (
    <Sheet
      open
      title={row.label}
      onClose={onClose}
      footer={
        <Button
          kind="primary"
          size="action"
          label="Take over"
          disabled={read.value === null || uWrong}
          onPress={accept}
          testID="quantity-accept"
        />
      }
    >
      <Field
        label="Value"
        value={value}
        onChange={setValue}
        type="number"
        unit={unit}
        error={read.value === null ? 'a number, for example 0.0751' : undefined}
        testID="quantity-value"
      />
      {row.kind === 'quantity' ? (
        <Field
          label="Standard uncertainty (k = 1)"
          value={u}
          onChange={setU}
          type="number"
          unit={unit}
          error={uWrong ? 'a number from 0' : undefined}
          testID="quantity-u"
        />
      ) : null}
      <Body>
        <Label>Reads </Label>
        {preview ?? '–'}
      </Body>
      <Label>Nothing is saved yet: changes are gathered and become one new revision with a reason.</Label>
      {problems.length === 0 ? null : (
        <ProblemNotice title="This does not fit the rig document" detail="Change the value, or another one first." errors={problems} />
      )}
    </Sheet>
  );
}
