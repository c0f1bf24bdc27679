import * as fc from 'fast-check';
import { type ProtocolDocument, protocolDocumentSchema, type Step } from '@/shared/protocol/document';
import {
  changeDocument,
  duplicateStep,
  type Edited,
  insertStep,
  moveStepDown,
  moveStepUp,
  nestInRepeat,
  removeStep,
  replaceStep,
  unnest,
} from '@/shared/protocol/edit';
import { beginHistory, canRedo, canUndo, historyReducer } from '@/shared/protocol/history';
import { emptyDocument, newStep } from '@/shared/protocol/new-step';
import { formatStepPath, parseStepPath, stepAt, type StepPath, walkSteps } from '@/shared/protocol/step-path';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { anyStep, documents } from './arbitraries';

const mark = (label: string): Step => ({ kind: 'mark', label });
const repeat = (...steps: Step[]): Step => ({ kind: 'repeat', times: 2, steps });
const document = (...steps: Step[]): ProtocolDocument => ({ formatVersion: 1, name: 'Test', steps });

/** Labels as an outline: `a (b c) d`. */
const outline = (steps: readonly Step[]): string =>
  steps.map((step) => (step.kind === 'repeat' ? `(${outline(step.steps)})` : (step.label ?? step.kind))).join(' ');
const shape = ({ document: { steps }, path }: Edited) => `${outline(steps)} @ ${path?.join('.') ?? 'none'}`;

const sample = document(mark('a'), repeat(mark('b'), mark('c')), mark('d'));

describe('each operation', () => {
  test('inserts before the step at the place, at the end, and into a repeat', () => {
    expect(shape(insertStep(sample, [1], mark('x')))).toBe('x a (b c) d @ 1');
    expect(shape(insertStep(sample, [4], mark('x')))).toBe('a (b c) d x @ 4');
    expect(shape(insertStep(sample, [2, 3], mark('x')))).toBe('a (b c x) d @ 2.3');
  });

  test('removes, and has the next step in hand, or the one before, or the repeat', () => {
    expect(shape(removeStep(sample, [1]))).toBe('(b c) d @ 1');
    expect(shape(removeStep(sample, [3]))).toBe('a (b c) @ 2');
    expect(shape(removeStep(document(repeat(mark('a'))), [1, 1]))).toBe('() @ 1');
    expect(shape(removeStep(document(mark('a')), [1]))).toBe(' @ none');
  });

  test('replaces and duplicates', () => {
    expect(shape(replaceStep(sample, [2, 1], mark('x')))).toBe('a (x c) d @ 2.1');
    expect(shape(duplicateStep(sample, [2]))).toBe('a (b c) (b c) d @ 3');
  });

  test('moves up row by row, into and out of a repeat', () => {
    let edited: Edited = { document: sample, path: [3] };
    const rows: string[] = [];
    for (let times = 0; times < 5; times += 1) {
      edited = moveStepUp(edited.document, edited.path as StepPath);
      rows.push(shape(edited));
    }
    expect(rows).toEqual(['a (b c d) @ 2.3', 'a (b d c) @ 2.2', 'a (d b c) @ 2.1', 'a d (b c) @ 2', 'd a (b c) @ 1']);
  });

  test('moves down row by row, back to where it was', () => {
    let edited: Edited = { document: document(mark('d'), mark('a'), repeat(mark('b'), mark('c'))), path: [1] };
    const rows: string[] = [];
    for (let times = 0; times < 5; times += 1) {
      edited = moveStepDown(edited.document, edited.path as StepPath);
      rows.push(shape(edited));
    }
    expect(rows).toEqual(['a d (b c) @ 2', 'a (d b c) @ 2.1', 'a (b d c) @ 2.2', 'a (b c d) @ 2.3', 'a (b c) d @ 3']);
  });

  test('stops at the ends', () => {
    expect(moveStepUp(sample, [1])).toEqual({ document: sample, path: [1] });
    expect(moveStepDown(sample, [3])).toEqual({ document: sample, path: [3] });
  });

  test('puts steps into a repeat and takes them out again', () => {
    const nested = nestInRepeat(sample, [1], { count: 2 });
    expect(shape(nested)).toBe('(a (b c)) d @ 1');
    expect(shape(unnest(nested.document, [1]))).toBe('a (b c) d @ 1');
    expect(shape(unnest(sample, [2, 1]))).toBe('a (c) b d @ 3');
    expect(shape(unnest(document(repeat(mark('a')), mark('b')), [1, 1]))).toBe('a b @ 1');
    expect(nestInRepeat(sample, [3], { repeat: { until: { localTime: '06:30' } } }).document.steps[2]).toEqual({
      kind: 'repeat',
      until: { localTime: '06:30' },
      steps: [mark('d')],
    });
  });

  test('never nests deeper than four: a move then passes a repeat by', () => {
    const four = repeat(repeat(repeat(repeat(mark('x')))));
    expect(nestInRepeat(document(four), [1])).toEqual({ document: document(four), path: [1] });
    expect(shape(moveStepDown(document(four, repeat(mark('y'))), [1]))).toBe('(y) ((((x)))) @ 2');
    expect(insertStep(document(repeat(repeat())), [1, 1, 1], repeat(repeat(repeat()))).document).toEqual(document(repeat(repeat())));
  });

  test('a place that does not exist changes nothing', () => {
    for (const path of [[9], [1, 1], [2, 9], [2, 1, 1], [0], []]) {
      expect(removeStep(sample, path).document).toBe(sample);
      expect(moveStepUp(sample, path).document).toBe(sample);
      expect(moveStepDown(sample, path).document).toBe(sample);
      expect(duplicateStep(sample, path).document).toBe(sample);
      expect(replaceStep(sample, path, mark('x')).document).toBe(sample);
      expect(unnest(sample, path).document).toBe(sample);
    }
    expect(insertStep(sample, [5], mark('x')).document).toBe(sample);
    expect(insertStep(sample, [1, 1], mark('x')).document).toBe(sample);
  });

  test('changes fields of the document, and takes away what is undefined', () => {
    const changed = changeDocument({ ...sample, atEnd: { station: 'clear' } }, { name: 'New', atEnd: undefined });
    expect(changed).toEqual({ ...sample, name: 'New' });
    expect('atEnd' in changed).toBe(false);
  });
});

type Operation = (document: ProtocolDocument, path: StepPath, step: Step) => Edited;
const operations: Operation[] = [
  insertStep,
  replaceStep,
  (edited, path) => removeStep(edited, path),
  (edited, path) => duplicateStep(edited, path),
  (edited, path) => moveStepUp(edited, path),
  (edited, path) => moveStepDown(edited, path),
  (edited, path) => nestInRepeat(edited, path),
  (edited, path) => nestInRepeat(edited, path, { count: 3 }),
  (edited, path) => unnest(edited, path),
];
const edits = fc.array(fc.record({ operation: fc.constantFrom(...operations), which: fc.nat(), step: anyStep }), { maxLength: 12 });

/** Applies the edits to places picked among those that exist. */
function applied(from: ProtocolDocument, list: { operation: Operation; which: number; step: Step }[]): Edited[] {
  const results: Edited[] = [];
  let current = from;
  for (const { operation, which, step } of list) {
    const places = [...walkSteps(current.steps)].map(({ positions }) => positions);
    const edited = operation(current, places[which % Math.max(1, places.length)] ?? [1], step);
    results.push(edited);
    current = edited.document;
  }
  return results;
}

describe('any row of edits', () => {
  test('keeps the document valid in the format, with a step where the hand is', () => {
    fc.assert(
      fc.property(documents, edits, (begin, list) => {
        for (const { document: edited, path } of applied(begin, list)) {
          expect(protocolDocumentSchema.safeParse(edited).success).toBe(true);
          expect(
            Math.max(0, ...[...walkSteps(edited.steps)].filter(({ step }) => step.kind === 'repeat').map(({ depth }) => depth + 1)),
          ).toBeLessThanOrEqual(4);
          if (path !== null && edited.steps.length > 0) expect(stepAt(edited, path)).not.toBeNull();
        }
      }),
    );
  });

  test('leaves the document it began from as it was', () => {
    fc.assert(
      fc.property(documents, edits, (begin, list) => {
        const before = JSON.stringify(begin);
        applied(begin, list);
        expect(JSON.stringify(begin)).toBe(before);
      }),
    );
  });

  test('moving never loses or doubles a step', () => {
    fc.assert(
      fc.property(documents, fc.nat(), fc.array(fc.boolean(), { maxLength: 30 }), (begin, which, ups) => {
        const leaves = (edited: ProtocolDocument) =>
          [...walkSteps(edited.steps)].map(({ step }) => (step.kind === 'repeat' ? 'repeat' : JSON.stringify(step))).sort();
        const places = [...walkSteps(begin.steps)];
        const picked = places[which % places.length];
        let edited: Edited = { document: begin, path: picked?.positions ?? [1] };
        for (const up of ups) {
          edited = (up ? moveStepUp : moveStepDown)(edited.document, edited.path as StepPath);
          expect(leaves(edited.document)).toEqual(leaves(begin));
          expect(stepAt(edited.document, edited.path as StepPath)).toEqual(picked?.step);
        }
      }),
    );
  });

  test('is undone to the very document it began from, and redone to the one it led to', () => {
    fc.assert(
      fc.property(documents, edits, (begin, list) => {
        const results = applied(begin, list).map((edited) => edited.document);
        const changes = results.filter((each, index) => each !== (results[index - 1] ?? begin));
        let history = results.reduce((past, each) => historyReducer(past, { kind: 'edit', document: each }), beginHistory(begin));
        history = changes.reduce((past) => historyReducer(past, { kind: 'undo' }), history);
        expect(history.present).toBe(begin);
        expect(canUndo(history)).toBe(false);
        history = changes.reduce((past) => historyReducer(past, { kind: 'redo' }), history);
        expect(history.present).toBe(changes.at(-1) ?? begin);
        expect(canRedo(history)).toBe(false);
      }),
    );
  });
});

describe('history', () => {
  const named = (name: string): ProtocolDocument => ({ ...sample, name });
  const edit = (name: string, mergeKey?: string) => ({
    kind: 'edit' as const,
    document: named(name),
    ...(mergeKey === undefined ? {} : { mergeKey }),
  });

  test('typing in one field is one step of undo, another field begins a new one', () => {
    let history = beginHistory(sample);
    for (const action of [edit('N', 'name'), edit('Ni', 'name'), edit('Nig', 'name'), edit('Nigh', 'notes')])
      history = historyReducer(history, action);
    history = historyReducer(history, { kind: 'undo' });
    expect(history.present.name).toBe('Nig');
    history = historyReducer(history, { kind: 'undo' });
    expect(history.present).toBe(sample);
  });

  test('typing after an undo does not merge with what came before it', () => {
    let history = [edit('A', 'name'), edit('B', 'x')].reduce(historyReducer, beginHistory(sample));
    history = historyReducer(historyReducer(history, { kind: 'undo' }), edit('C', 'name'));
    expect(historyReducer(history, { kind: 'undo' }).present.name).toBe('A');
  });

  test('an edit after an undo takes the redo away', () => {
    let history = [edit('A'), edit('B')].reduce(historyReducer, beginHistory(sample));
    history = historyReducer(historyReducer(history, { kind: 'undo' }), edit('C'));
    expect(canRedo(history)).toBe(false);
  });

  test('nothing to undo or redo changes nothing, another document begins anew', () => {
    const history = beginHistory(sample);
    expect(historyReducer(history, { kind: 'undo' })).toBe(history);
    expect(historyReducer(history, { kind: 'redo' })).toBe(history);
    expect(historyReducer(historyReducer(history, edit('A')), { kind: 'load', document: sample })).toEqual(history);
  });
});

describe('paths', () => {
  test('are written with kinds and read with pass numbers', () => {
    expect(formatStepPath(sample, [2, 1])).toBe('2.repeat.1.mark');
    expect(formatStepPath(sample, [2, 7])).toBeNull();
    expect(parseStepPath('2.repeat.1.mark')).toEqual([2, 1]);
    expect(parseStepPath('2.repeat[13].1.mark')).toEqual([2, 1]);
    expect(parseStepPath('atEnd')).toBeNull();
  });

  test('of every step can be read back', () => {
    fc.assert(
      fc.property(documents, (each) => {
        for (const { path, positions, step } of walkSteps(each.steps)) {
          expect(parseStepPath(path)).toEqual(positions);
          expect(formatStepPath(each, positions)).toBe(path);
          expect(stepAt(each, positions)).toBe(step);
        }
      }),
    );
  });
});

test('a new step of each kind fits the format', () => {
  const kinds = ['home', 'swing', 'dwell', 'kick', 'settle', 'wait', 'proof', 'mark', 'prompt', 'rotate', 'repeat'] as const;
  for (const kind of kinds)
    expect(protocolDocumentSchema.safeParse({ ...emptyDocument('New'), steps: [newStep(kind, demoRigWide)] }).success).toBe(true);
});
