import { View } from 'react-native';
import { Body, Button, Chip, Panel, type Tone } from '@/components/ui';
import type { DraftSync } from './use-draft-sync';
import type { SaveStatus } from './save-reducer';

const words: Record<SaveStatus, { words: string; dot: Tone }> = {
  saved: { words: 'draft saved', dot: 'good' },
  unsaved: { words: 'saving', dot: 'lamp' },
  saving: { words: 'saving', dot: 'lamp' },
  refused: { words: 'not saved', dot: 'danger' },
  unreachable: { words: 'kept on this device', dot: 'lamp' },
  'signed-out': { words: 'kept on this device', dot: 'lamp' },
  overtaken: { words: 'not saved', dot: 'danger' },
};

/** In two words whether the draft is safe. */
export function SaveChip({ status, revision }: { status: SaveStatus; revision: string }) {
  const { words: state, dot } = words[status];
  return (
    <Chip dot={dot} testID="save-state">
      {status === 'saved' ? revision : state}
    </Chip>
  );
}

/** Why the draft is not saved and what becomes of it; nothing while all is well. */
export function SaveTrouble({ sync }: { sync: DraftSync }) {
  const { status, detail } = sync.state;
  if (status !== 'refused' && status !== 'unreachable' && status !== 'signed-out') return null;
  return (
    <Panel edge={status === 'refused' ? 'danger' : 'lamp'} testID="save-trouble">
      <View role="status" aria-live="polite" className="gap-2">
        <Body strong>{status === 'refused' ? 'The draft is not saved as it is' : 'The draft is not on the server yet'}</Body>
        <Body>
          {status === 'refused'
            ? `${detail} Your edits are kept on this device and sent when this is put right.`
            : 'Your edits are kept on this device and sent by themselves when the server answers.'}
        </Body>
      </View>
      {status === 'refused' ? <Button label="Try again" className="mt-3 self-start" onPress={sync.tryAgain} /> : null}
    </Panel>
  );
}
