import { View } from 'react-native';
import { IconButton } from '@/components/ui';
import type { ProtocolView } from '@/shared/contracts/protocols';
import { useEditor } from './editor-context';
import type { EditorSheet } from './editor-sheets';
import { SaveChip } from './save-state';
import type { SaveStatus } from './save-reducer';

/** Which revision the draft becomes, as `rev 7 draft`, or which it is. */
const draftWords = (protocol: ProtocolView): string =>
  protocol.draftDiffers ? `rev ${(protocol.latestRevision ?? 0) + 1} draft` : `rev ${protocol.latestRevision ?? 0}`;

interface EditorTrailingProps {
  protocol: ProtocolView;
  status: SaveStatus;
  onOpen: (sheet: EditorSheet) => void;
}

/** At the right of the title: state of the draft, and the way to everything that is not a step. */
export function EditorTrailing({ protocol, status, onOpen }: EditorTrailingProps) {
  const { select } = useEditor();
  return (
    <View className="flex-row items-center gap-1">
      <SaveChip status={status} revision={draftWords(protocol)} />
      <View className="hidden wide:flex">
        <IconButton icon="edit" label="Details of the protocol" onPress={() => select(null)} />
      </View>
      <IconButton icon="more" label="More: details, revisions, export" onPress={() => onOpen('more')} testID="open-more" />
    </View>
  );
}
