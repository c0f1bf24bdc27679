import { useQueryClient } from '@tanstack/react-query';
import { useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { labKey, useLab, useLabMutation, wordsOf } from '@/components/api';
import { Body, Button, fileNameOf, Label, ProblemNotice, saveTextFile, Sheet, useToast } from '@/components/ui';
import { createProtocol, deleteProtocol, listProtocols, type ProtocolView } from '@/shared/contracts/protocols';
import { exportProtocolText } from '@/shared/protocol/json';
import { dropBackup } from './draft-backup';
import { useEditor } from './editor-context';
import type { DraftSync } from './use-draft-sync';

interface MoreSheetProps {
  protocol: ProtocolView;
  sync: DraftSync;
  onClose: () => void;
  onDetails: () => void;
}

/** What is done to a protocol as a whole: revisions, export, a copy, deletion while it was never issued. */
export function MoreSheet({ protocol, sync, onClose, onDetails }: MoreSheetProps) {
  const { document, mayWrite } = useEditor();
  const router = useRouter();
  const go = async (href: string) => {
    await sync.flush();
    onClose();
    router.push(href as Href);
  };
  const copy = useCopy(document, onClose);
  return (
    <Sheet open title={document.name} onClose={onClose} testID="more-sheet">
      <View className="gap-2">
        <Button icon="edit" label="Name, interruption, end, planned start" onPress={onDetails} testID="open-protocol-details" />
        <Button
          icon="compare"
          label={`Revisions (${protocol.revisions.length}) and comparison`}
          onPress={() => void go(`/protocols/${protocol.id}/revisions`)}
          testID="open-revisions"
        />
        <Button
          icon="export"
          label="Save as JSON"
          onPress={() => saveTextFile(`${fileNameOf(document.name)}.protocol.json`, exportProtocolText(document))}
          testID="export-protocol"
        />
        {mayWrite ? (
          <Button
            icon="duplicate"
            label="Make a copy"
            busy={copy.isPending}
            onPress={() => copy.mutate({ body: { document: { ...document, name: `${document.name}, copy`.slice(0, 120) } } })}
            testID="copy-protocol"
          />
        ) : null}
      </View>
      {copy.isError ? <ProblemNotice title="No copy was made" {...wordsOf(copy.error)} /> : null}
      {mayWrite ? <Deletion protocol={protocol} /> : null}
    </Sheet>
  );
}

function useCopy(document: ProtocolView['document'], onClose: () => void) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const router = useRouter();
  const toast = useToast();
  return useLabMutation(createProtocol, ({ data }) => {
    void queries.invalidateQueries({ queryKey: labKey(labId, listProtocols) });
    toast.show({ text: `This is the copy of ${document.name}.` });
    onClose();
    router.push(`/protocols/${data.id}` as Href);
  });
}

function Deletion({ protocol }: { protocol: ProtocolView }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const router = useRouter();
  const toast = useToast();
  const [asked, setAsked] = useState(false);
  const remove = useLabMutation(deleteProtocol, () => {
    dropBackup(protocol.id);
    void queries.invalidateQueries({ queryKey: labKey(labId, listProtocols) });
    toast.show({ text: `${protocol.name} is deleted.` });
    router.replace('/protocols');
  });
  if (protocol.latestRevision !== null) return <Label>It has issued revisions, which runs may refer to, so it cannot be deleted.</Label>;
  return (
    <View className="gap-3 border-t border-line pt-4">
      {remove.isError ? <ProblemNotice title="The protocol was not deleted" {...wordsOf(remove.error)} /> : null}
      {asked ? <Body>The draft is gone then for everybody. Save it as JSON first if in doubt.</Body> : null}
      {asked ? (
        <Button
          kind="danger"
          icon="remove"
          label="Delete for good"
          busy={remove.isPending}
          onPress={() => remove.mutate({ params: { protocolId: protocol.id } })}
          testID="delete-protocol-confirm"
        />
      ) : (
        <Button kind="quiet" label="Delete the protocol" className="self-start" onPress={() => setAsked(true)} testID="delete-protocol" />
      )}
    </View>
  );
}
