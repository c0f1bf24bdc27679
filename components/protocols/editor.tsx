import { useCallback, useMemo, useState } from 'react';
import { useLab, useMay } from '@/components/api';
import { Screen, useWide } from '@/components/ui';
import type { ProtocolView } from '@/shared/contracts/protocols';
import type { StepPath } from '@/shared/protocol/step-path';
import { readBackup } from './draft-backup';
import { EditorAside } from './editor-aside';
import { EditorContext, type EditorApi } from './editor-context';
import { EditorFooter } from './editor-footer';
import { EditorMain } from './editor-main';
import { EditorSheets, type EditorSheet } from './editor-sheets';
import { EditorTrailing } from './editor-trailing';
import { useAdopted } from './use-adopted';
import { useDraftSync } from './use-draft-sync';
import { useHistoryKeys } from './use-editor-keys';
import { useEditorState } from './use-editor-state';
import { usePlan } from './use-plan';
import { usePlanningRig } from './use-planning-rig';
import { useSurroundings } from './use-surroundings';

interface EditorProps {
  protocol: ProtocolView;
  etag: string;
}

/** The editor of one protocol's draft. */
export function Editor({ protocol, etag }: EditorProps) {
  const { timeZone } = useLab();
  const wide = useWide();
  const mayWrite = useMay('protocol.write').ok;
  const [begin] = useState(() => ({ etag, document: protocol.document, backup: readBackup(protocol.id) }));
  const state = useEditorState(begin.backup?.document ?? begin.document);
  const sync = useDraftSync({
    protocolId: protocol.id,
    document: state.document,
    begin: begin.backup === null ? begin : { etag: begin.backup.etag, document: begin.document },
    mayWrite,
  });
  useAdopted({ protocol, etag, sync, put: state.putDocument });
  // What was read of the protocol is about the draft of its ETag: one that was saved since differs until it is read again.
  const shown = sync.state.etag === etag ? protocol : { ...protocol, draftDiffers: true };
  const planning = usePlanningRig();
  const surroundings = useSurroundings(planning.rig);
  const [startAt, setStartAt] = useState('');
  const plan = usePlan({ document: state.document, rig: planning.rig?.document ?? null, surroundings, timeZone, startAt });
  const [sheet, setSheet] = useState<EditorSheet>(null);
  const { select } = state;
  const openDetails = useCallback((path: StepPath) => (wide ? focusDetails() : (select(path), setSheet('step'))), [wide, select]);
  const editor = useMemo<EditorApi>(
    () => ({ ...state, plan, rig: planning.rig, timeZone, mayWrite, openDetails }),
    [state, plan, planning.rig, timeZone, mayWrite, openDetails],
  );
  useHistoryKeys(mayWrite ? state : { undo: null, redo: null });
  const details = { planning, startAt, onStartAt: setStartAt };
  return (
    <EditorContext.Provider value={editor}>
      <Screen
        title={state.document.name}
        back={{ href: '/protocols', label: 'protocols' }}
        testID="editor"
        trailing={<EditorTrailing protocol={shown} status={sync.state.status} onOpen={setSheet} />}
        asideOnlyWide
        footerGivesWay
        aside={<EditorAside {...details} />}
        footer={mayWrite ? <EditorFooter protocol={shown} status={sync.state.status} onOpen={setSheet} /> : undefined}
      >
        <EditorMain sync={sync} startAt={startAt} planning={planning} restored={begin.backup !== null} />
      </Screen>
      <EditorSheets open={sheet} onOpen={setSheet} protocol={protocol} sync={sync} details={details} />
    </EditorContext.Provider>
  );
}

/** When wide, the details stand in the right pane already: Enter leads into them. */
function focusDetails(): void {
  requestAnimationFrame(() =>
    document
      .querySelector<HTMLElement>(
        '[data-testid="editor-aside"] input, [data-testid="editor-aside"] select, [data-testid="editor-aside"] [role="radio"][tabindex="0"]',
      )
      ?.focus(),
  );
}
