import type { ProtocolDocument } from '@/shared/protocol/document';
import type { Edited } from '@/shared/protocol/edit';
import { beginHistory, historyReducer, type History } from '@/shared/protocol/history';
import { stepAt, type StepPath } from '@/shared/protocol/step-path';

/** The draft with its undo history and the step in hand. */
export interface EditorState {
  history: History;
  selected: StepPath | null;
}

export type EditorAction =
  | { kind: 'change'; edited: Edited; mergeKey?: string }
  | { kind: 'document'; document: ProtocolDocument; mergeKey?: string }
  | { kind: 'select'; path: StepPath | null }
  | { kind: 'undo' }
  | { kind: 'redo' };

export const beginEditor = (document: ProtocolDocument): EditorState => ({ history: beginHistory(document), selected: null });

/** The deepest part of a path that still leads to a step; null where nothing is left of it. */
function nearest(document: ProtocolDocument, path: StepPath | null): StepPath | null {
  for (let length = path?.length ?? 0; length > 0; length -= 1) {
    const candidate = (path ?? []).slice(0, length);
    if (stepAt(document, candidate) !== null) return candidate;
  }
  return null;
}

const withHistory = (state: EditorState, history: History, path: StepPath | null): EditorState => ({
  history,
  selected: nearest(history.present, path),
});

/** The editor as a pure function of what is done in it. */
export function editorReducer(state: EditorState, action: EditorAction): EditorState {
  switch (action.kind) {
    case 'change': {
      const { edited, mergeKey } = action;
      return withHistory(
        state,
        historyReducer(state.history, { kind: 'edit', document: edited.document, ...(mergeKey === undefined ? {} : { mergeKey }) }),
        edited.path,
      );
    }
    case 'document':
      return withHistory(state, historyReducer(state.history, { ...action, kind: 'edit' }), state.selected);
    case 'select':
      return { ...state, selected: nearest(state.history.present, action.path) };
    case 'undo':
    case 'redo':
      return withHistory(state, historyReducer(state.history, action), state.selected);
  }
}

/** All steps as rows in reading order: paths for the arrow keys. */
export function rowPaths(document: ProtocolDocument): StepPath[] {
  const walk = (steps: ProtocolDocument['steps'], around: StepPath): StepPath[] =>
    steps.flatMap((step, index) => [[...around, index + 1], ...(step.kind === 'repeat' ? walk(step.steps, [...around, index + 1]) : [])]);
  return walk(document.steps, []);
}

export const samePath = (a: StepPath | null, b: StepPath | null): boolean =>
  a !== null && b !== null && a.length === b.length && a.every((position, index) => position === b[index]);
