import { View } from 'react-native';
import { IconButton } from '@/components/ui';
import { useEditor } from './editor-context';

/** What can be done with the step in hand, and undo and redo, within the thumb's reach. */
export function EditorToolbar() {
  const editor = useEditor();
  const none = editor.selectedStep === null;
  const isRepeat = editor.selectedStep?.kind === 'repeat';
  const inRepeat = (editor.selected?.length ?? 0) > 1;
  return (
    <View role="toolbar" aria-label="Edit steps" className="flex-row items-center justify-between">
      <IconButton shared icon="undo" label="Undo" onPress={() => editor.undo?.()} disabled={editor.undo === null} testID="undo" />
      <IconButton shared icon="redo" label="Redo" onPress={() => editor.redo?.()} disabled={editor.redo === null} testID="redo" />
      <IconButton shared icon="up" label="Move up" onPress={editor.moveUp} disabled={none} testID="move-up" />
      <IconButton shared icon="down" label="Move down" onPress={editor.moveDown} disabled={none} testID="move-down" />
      {isRepeat || inRepeat ? (
        <IconButton
          shared
          icon="unnest"
          label={isRepeat ? 'Take the steps out of the repeat' : 'Take out of the repeat'}
          onPress={editor.unnest}
          testID="unnest"
        />
      ) : (
        <IconButton shared icon="nest" label="Put into a repeat" onPress={editor.nest} disabled={none} testID="nest" />
      )}
      <IconButton shared icon="duplicate" label="Duplicate" onPress={editor.duplicate} disabled={none} testID="duplicate" />
      <IconButton shared icon="remove" label="Delete" onPress={editor.remove} disabled={none} testID="delete" />
    </View>
  );
}
