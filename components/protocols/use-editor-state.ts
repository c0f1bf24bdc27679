import { useMemo, useReducer } from 'react';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import {
  changeDocument,
  duplicateStep,
  insertStep,
  moveStepDown,
  moveStepUp,
  nestInRepeat,
  removeStep,
  replaceStep,
  unnest,
  type Edited,
} from '@/shared/protocol/edit';
import { canRedo, canUndo } from '@/shared/protocol/history';
import { stepAt, type StepPath } from '@/shared/protocol/step-path';
import type { EditorApi } from './editor-context';
import { beginEditor, editorReducer } from './editor-reducer';

type EditorActs = Omit<EditorApi, 'plan' | 'rig' | 'timeZone' | 'mayWrite' | 'openDetails'>;

function placeFor(document: ProtocolDocument, selected: StepPath | null, place: 'after' | 'inside'): StepPath {
  if (selected === null) return [document.steps.length + 1];
  const step = stepAt(document, selected);
  if (place === 'inside' && step?.kind === 'repeat') return [...selected, step.steps.length + 1];
  return [...selected.slice(0, -1), (selected.at(-1) ?? 0) + 1];
}

/** The draft under edit with everything that can be done to it. */
export function useEditorState(begin: ProtocolDocument): EditorActs {
  const [state, dispatch] = useReducer(editorReducer, begin, beginEditor);
  const document = state.history.present;
  const { selected } = state;
  return useMemo(() => {
    const change = (edited: Edited, mergeKey?: string) =>
      dispatch({ kind: 'change', edited, ...(mergeKey === undefined ? {} : { mergeKey }) });
    const onSelected = (operation: (document: ProtocolDocument, path: StepPath) => Edited) => () =>
      selected === null ? undefined : change(operation(document, selected));
    return {
      document,
      selected,
      selectedStep: selected === null ? null : stepAt(document, selected),
      undo: canUndo(state.history) ? () => dispatch({ kind: 'undo' }) : null,
      redo: canRedo(state.history) ? () => dispatch({ kind: 'redo' }) : null,
      select: (path) => dispatch({ kind: 'select', path }),
      insert: (step: Step, place) => change(insertStep(document, placeFor(document, selected, place), step)),
      replace: (path, step) => change({ ...replaceStep(document, path, step), path: selected }, `step ${path.join('.')}`),
      moveUp: onSelected(moveStepUp),
      moveDown: onSelected(moveStepDown),
      nest: onSelected((draft, path) => nestInRepeat(draft, path)),
      unnest: onSelected(unnest),
      duplicate: onSelected(duplicateStep),
      remove: onSelected(removeStep),
      changeDocument: (fields, mergeKey) =>
        dispatch({ kind: 'document', document: changeDocument(document, fields), ...(mergeKey === undefined ? {} : { mergeKey }) }),
      putDocument: (next) => dispatch({ kind: 'document', document: next }),
    };
  }, [document, selected, state.history]);
}
