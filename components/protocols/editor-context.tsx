import { createContext, useContext } from 'react';
import type { RigView } from '@/shared/contracts/rigs';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import type { StepPath } from '@/shared/protocol/step-path';
import type { Plan } from './plan';

/** What the parts of the editor share. */
export interface EditorApi {
  document: ProtocolDocument;
  selected: StepPath | null;
  selectedStep: Step | null;
  plan: Plan | null;
  rig: RigView | null;
  timeZone: string;
  mayWrite: boolean;
  undo: (() => void) | null;
  redo: (() => void) | null;
  select: (path: StepPath | null) => void;
  /** Shows the details of a step: a sheet on a phone, the right pane when wide. */
  openDetails: (path: StepPath) => void;
  /** Puts a step in: after the step in hand, inside the repeat in hand, or at the end. */
  insert: (step: Step, place: 'after' | 'inside') => void;
  replace: (path: StepPath, step: Step) => void;
  moveUp: () => void;
  moveDown: () => void;
  nest: () => void;
  unnest: () => void;
  duplicate: () => void;
  remove: () => void;
  /** Puts another document in the place of this one, as one step of undo. */
  putDocument: (document: ProtocolDocument) => void;
  changeDocument: (change: Partial<Omit<ProtocolDocument, 'formatVersion' | 'steps'>>, mergeKey?: string) => void;
}

export const EditorContext = createContext<EditorApi | null>(null);

export function useEditor(): EditorApi {
  const editor = useContext(EditorContext);
  if (editor === null) throw new Error('useEditor needs an editor above it');
  return editor;
}
