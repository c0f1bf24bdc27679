import { Sheet } from '@/components/ui';
import type { ProtocolView } from '@/shared/contracts/protocols';
import { AddStepSheet } from './add-step-sheet';
import { ConflictSheet } from './conflict-sheet';
import { useEditor } from './editor-context';
import { IssueSheet } from './issue-sheet';
import { MoreSheet } from './more-sheet';
import { ProtocolDetails } from './protocol-details';
import { RehearseSheet } from './rehearse-sheet';
import { StepDetails } from './step-details';
import { stepTitle } from './step-words';
import type { DraftSync } from './use-draft-sync';
import type { PlanningRig } from './use-planning-rig';

export type EditorSheet = 'step' | 'protocol' | 'add' | 'issue' | 'rehearse' | 'more' | null;

interface EditorSheetsProps {
  open: EditorSheet;
  onOpen: (sheet: EditorSheet) => void;
  protocol: ProtocolView;
  sync: DraftSync;
  details: { planning: PlanningRig; startAt: string; onStartAt: (startAt: string) => void };
}

/** The one sheet that is open over the editor; a conflict comes before all others. */
export function EditorSheets({ open, onOpen, protocol, sync, details }: EditorSheetsProps) {
  const editor = useEditor();
  const close = () => onOpen(null);
  if (sync.state.status === 'overtaken')
    return <ConflictSheet protocolId={protocol.id} mine={editor.document} sync={sync} onTheirs={editor.putDocument} />;
  switch (open) {
    case 'step':
      return editor.selected === null || editor.selectedStep === null ? null : (
        <Sheet open title={`Step ${editor.selected.join('.')}: ${stepTitle(editor.selectedStep)}`} onClose={close} testID="step-sheet">
          <StepDetails path={editor.selected} />
        </Sheet>
      );
    case 'protocol':
      return (
        <Sheet open title="Protocol" onClose={close} testID="protocol-sheet">
          <ProtocolDetails {...details} />
        </Sheet>
      );
    case 'add':
      return <AddStepSheet rig={editor.rig?.document ?? null} onClose={close} />;
    case 'issue':
      return <IssueSheet protocol={protocol} sync={sync} onClose={close} />;
    case 'rehearse':
      return <RehearseSheet protocolId={protocol.id} sync={sync} onClose={close} />;
    case 'more':
      return <MoreSheet protocol={protocol} sync={sync} onClose={close} onDetails={() => onOpen('protocol')} />;
    case null:
      return null;
  }
}
