import type { ProtocolDocument } from './document';

/** Undo and redo of the editor, as a reducer. */
export interface History {
  past: readonly ProtocolDocument[];
  present: ProtocolDocument;
  future: readonly ProtocolDocument[];
  /** Edits with the same key that follow each other, such as typing in one field, are one step of undo. */
  mergeKey: string | null;
}

export type HistoryAction =
  | { kind: 'edit'; document: ProtocolDocument; mergeKey?: string }
  | { kind: 'undo' }
  | { kind: 'redo' }
  /** Another document takes the place of everything: nothing to undo. */
  | { kind: 'load'; document: ProtocolDocument };

const greatestLength = 200;

/** A history with nothing to undo. */
export function beginHistory(document: ProtocolDocument): History {
  return { past: [], present: document, future: [], mergeKey: null };
}

/** The history after an action. An edit that changes nothing, an undo or a redo with nothing to take, leave it as it is. */
export function historyReducer(history: History, action: HistoryAction): History {
  switch (action.kind) {
    case 'load':
      return beginHistory(action.document);
    case 'edit':
      return afterEdit(history, action.document, action.mergeKey ?? null);
    case 'undo': {
      const previous = history.past.at(-1);
      if (previous === undefined) return history;
      return { past: history.past.slice(0, -1), present: previous, future: [history.present, ...history.future], mergeKey: null };
    }
    case 'redo': {
      const [next, ...future] = history.future;
      if (next === undefined) return history;
      return { past: [...history.past, history.present], present: next, future, mergeKey: null };
    }
  }
}

function afterEdit(history: History, document: ProtocolDocument, mergeKey: string | null): History {
  if (document === history.present) return history;
  const merges = mergeKey !== null && mergeKey === history.mergeKey && history.past.length > 0;
  const past = merges ? history.past : [...history.past, history.present].slice(-greatestLength);
  return { past, present: document, future: [], mergeKey };
}

export const canUndo = (history: History): boolean => history.past.length > 0;
export const canRedo = (history: History): boolean => history.future.length > 0;
