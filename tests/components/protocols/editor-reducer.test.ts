import { beginEditor, editorReducer, rowPaths, samePath, type EditorAction } from '@/components/protocols/editor-reducer';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { duplicateStep, moveStepDown, removeStep, replaceStep } from '@/shared/protocol/edit';

const document: ProtocolDocument = {
  formatVersion: 1,
  name: 'Two pairs',
  steps: [
    { kind: 'home' },
    {
      kind: 'repeat',
      times: 2,
      steps: [
        { kind: 'swing', to: 'near' },
        { kind: 'dwell', beat_periods: 2 },
      ],
    },
    { kind: 'mark', label: 'end' },
  ],
};
const after = (...actions: EditorAction[]) => actions.reduce(editorReducer, beginEditor(document));

test('rows are the steps in reading order, repeats before what they hold', () => {
  expect(rowPaths(document)).toEqual([[1], [2], [2, 1], [2, 2], [3]]);
});

test('the step in hand stays in hand where an edit moves it', () => {
  const moved = after({ kind: 'select', path: [1] }, { kind: 'change', edited: moveStepDown(document, [1]) });
  expect(moved.selected).toEqual([1, 1]);
  expect(moved.history.present.steps[0]?.kind).toBe('repeat');
});

test('undo and redo go through the states and keep a step in hand that still exists', () => {
  const copied = { kind: 'change', edited: duplicateStep(document, [3]) } as const;
  const state = after(copied, { kind: 'undo' });
  expect(state.history.present).toBe(document);
  expect(state.selected).toBeNull();
  expect(editorReducer(state, { kind: 'redo' }).history.present.steps).toHaveLength(4);
});

test('after an undo inside a repeat that is gone, the repeat’s own place is in hand', () => {
  const emptied = after({ kind: 'change', edited: removeStep(document, [2, 2]) });
  const state = editorReducer(editorReducer(emptied, { kind: 'select', path: [2, 1] }), {
    kind: 'change',
    edited: removeStep(emptied.history.present, [2, 1]),
  });
  expect(state.selected).toEqual([2]);
});

test('typing in one field is one step of undo', () => {
  const typed = (periods: number): EditorAction => ({
    kind: 'change',
    edited: replaceStep(document, [2, 2], { kind: 'dwell', periods }),
    mergeKey: 'step 2.2',
  });
  expect(after(typed(3), typed(3.5), { kind: 'undo' }).history.present).toBe(document);
});

test('a place without a step cannot be chosen', () => {
  expect(after({ kind: 'select', path: [9] }).selected).toBeNull();
  expect(samePath([2, 1], [2, 1])).toBe(true);
  expect(samePath([2], [2, 1])).toBe(false);
});
