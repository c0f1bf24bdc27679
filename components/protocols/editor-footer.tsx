import { useRouter, type Href } from 'expo-router';
import { View } from 'react-native';
import { useMay } from '@/components/api';
import { Button, IconButton } from '@/components/ui';
import type { ProtocolView } from '@/shared/contracts/protocols';
import { useEditor } from './editor-context';
import type { EditorSheet } from './editor-sheets';
import { EditorToolbar } from './editor-toolbar';
import type { SaveStatus } from './save-reducer';

interface EditorFooterProps {
  protocol: ProtocolView;
  status: SaveStatus;
  onOpen: (sheet: EditorSheet) => void;
}

/** Within the thumb's reach: the step in hand, a new step, rehearse, issue; start once the draft is issued. */
export function EditorFooter({ protocol, status, onOpen }: EditorFooterProps) {
  const { rig } = useEditor();
  const mayStart = useMay('run.start').ok;
  const router = useRouter();
  const issued = protocol.latestRevision !== null && !protocol.draftDiffers && status === 'saved';
  const start = () => router.push(`/rigs/${rig?.id ?? ''}/start?protocol=${protocol.id}&revision=${protocol.latestRevision ?? 1}` as Href);
  return (
    <View className="gap-2 wide:flex-row-reverse wide:items-center wide:gap-6">
      <EditorToolbar />
      <View className="flex-1 flex-row gap-2">
        <IconButton
          icon="plus"
          label="Add a step"
          tone="lamp"
          onPress={() => onOpen('add')}
          className="min-h-action w-16 bg-panel2"
          testID="add-step"
        />
        <Button size="action" label="Rehearse" onPress={() => onOpen('rehearse')} className="px-4" testID="rehearse" />
        {issued && rig !== null && mayStart ? (
          <Button
            size="action"
            kind="primary"
            icon="start"
            label="Start"
            accessibilityLabel={`Start revision ${protocol.latestRevision ?? 1} on ${rig.name}`}
            onPress={start}
            className="flex-1 px-2"
            testID="start-revision"
          />
        ) : (
          <Button
            size="action"
            kind="primary"
            label={`Issue rev ${(protocol.latestRevision ?? 0) + 1}`}
            disabled={issued}
            onPress={() => onOpen('issue')}
            className="flex-1 px-2"
            testID="issue"
          />
        )}
      </View>
    </View>
  );
}
