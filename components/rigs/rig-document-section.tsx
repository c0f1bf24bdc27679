import { useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { useMay } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Button, fileNameOf, Section, saveTextFile } from '@/components/ui';
import type { RigView } from '@/shared/contracts/rigs';
import { BudgetFirstPanel } from './budget-first-panel';
import type { DocumentRow } from './document-rows';
import { DocumentList } from './document-list';
import { FibrePanel } from './fibre-panel';
import { QuantitySheet } from './quantity-sheet';
import { ReviseSheet } from './revise-sheet';
import { RigImportSheet } from './rig-import-sheet';
import { useRigDraft } from './use-rig-draft';

type OpenSheet = { kind: 'quantity'; row: DocumentRow } | { kind: 'import' } | { kind: 'revise' } | null;

/** What the rig is, every quantity with its uncertainty; a keeper changes values here and makes a new revision of them. */
export function RigDocumentSection({ rig, etag }: { rig: RigView; etag: string | undefined }) {
  const router = useRouter();
  const mayEdit = useMay('rig.edit').ok;
  const draft = useRigDraft(rig.document);
  const [sheet, setSheet] = useState<OpenSheet>(null);
  const close = () => setSheet(null);
  return (
    <Section title={`Apparatus, revision ${rig.revision}`}>
      <View className="flex-row flex-wrap gap-2">
        <Button label="Revisions" onPress={() => router.push(`/rigs/${rig.id}/revisions` as Href)} testID="rig-revisions" />
        <Button label="Stations" onPress={() => router.push(`/rigs/${rig.id}/stations` as Href)} testID="rig-stations" />
        <Button
          icon="export"
          label="JSON"
          accessibilityLabel="Save the rig document as JSON"
          onPress={() => saveTextFile(`${fileNameOf(rig.name)}-rev-${rig.revision}.rig.json`, `${JSON.stringify(rig.document, null, 2)}\n`)}
          testID="rig-export"
        />
        {mayEdit ? (
          <Button
            icon="import"
            label="Import"
            accessibilityLabel="Import a rig document"
            onPress={() => setSheet({ kind: 'import' })}
            testID="rig-import"
          />
        ) : null}
      </View>
      <MayNote act="rig.edit" />
      {draft.changes.length === 0 ? null : (
        <View className="gap-2">
          <Button
            kind="primary"
            label={`Review ${draft.changes.length} ${draft.changes.length === 1 ? 'change' : 'changes'}`}
            onPress={() => setSheet({ kind: 'revise' })}
            testID="rig-review"
          />
          <Button kind="quiet" label="Discard the changes" onPress={draft.discard} />
        </View>
      )}
      <DocumentList
        document={draft.document}
        changed={draft.changes.map((change) => change.path)}
        onPress={mayEdit ? (row) => setSheet({ kind: 'quantity', row }) : undefined}
      />
      <BudgetFirstPanel document={draft.document} />
      <FibrePanel document={draft.document} />
      {sheet?.kind === 'quantity' ? <QuantitySheet row={sheet.row} draft={draft} onClose={close} /> : null}
      {sheet?.kind === 'import' ? <RigImportSheet onDocument={draft.set} onClose={close} /> : null}
      {sheet?.kind === 'revise' ? <ReviseSheet rig={rig} etag={etag} draft={draft} onClose={close} /> : null}
    </Section>
  );
}
