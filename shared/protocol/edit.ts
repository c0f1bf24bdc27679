import { greatestNesting } from './check-structure';
import type { ProtocolDocument, RepeatStep, Step } from './document';
import { type StepPath, stepAt } from './step-path';

/**
 * The editor's operations: each takes a document and the place of a step and gives a new document, sharing what did not change, and
 * the place where the step in hand is now. A place that does not exist, or a move that cannot be made, leaves both as they were.
 */

export interface Edited {
  document: ProtocolDocument;
  /** Place of the step in hand; null when there is none left. */
  path: StepPath | null;
}

type Lists = (steps: readonly Step[]) => readonly Step[];

const parentOf = (path: StepPath): StepPath => path.slice(0, -1);
const positionOf = (path: StepPath): number => path[path.length - 1] ?? 0;
const shifted = (path: StepPath, by: number): StepPath => [...parentOf(path), positionOf(path) + by];

/** Replaces the list of steps inside the repeat at `parent` (the outermost list for an empty path). */
function withList(steps: readonly Step[], parent: StepPath, change: Lists): Step[] {
  const [first, ...rest] = parent;
  if (first === undefined) return [...change(steps)];
  return steps.map((step, index) =>
    index === first - 1 && step.kind === 'repeat' ? { ...step, steps: withList(step.steps, rest, change) } : step,
  );
}

const changed = (document: ProtocolDocument, parent: StepPath, change: Lists): ProtocolDocument => ({
  ...document,
  steps: withList(document.steps, parent, change),
});

const spliced = (steps: readonly Step[], from: number, { remove, put }: { remove: number; put: readonly Step[] }): Step[] => [
  ...steps.slice(0, from - 1),
  ...put,
  ...steps.slice(from - 1 + remove),
];

/** The list of steps at a parent path; null where the parent is no repeat. */
function listAt(document: ProtocolDocument, parent: StepPath): readonly Step[] | null {
  if (parent.length === 0) return document.steps;
  const step = stepAt(document, parent);
  return step?.kind === 'repeat' ? step.steps : null;
}

/** Number of repeats stacked in the step itself. */
function height(step: Step): number {
  return step.kind === 'repeat' ? 1 + Math.max(0, ...step.steps.map(height)) : 0;
}

const fits = (step: Step, depth: number) => depth + height(step) <= greatestNesting;

/** Puts a step in so that it stands at `path`; the steps from there on move down by one. */
export function insertStep(document: ProtocolDocument, path: StepPath, step: Step): Edited {
  const list = listAt(document, parentOf(path));
  const position = positionOf(path);
  if (list === null || position < 1 || position > list.length + 1 || !fits(step, path.length - 1)) return { document, path };
  return { document: changed(document, parentOf(path), (steps) => spliced(steps, position, { remove: 0, put: [step] })), path };
}

/** Takes a step out. In hand is then the one that moved up into its place, else the one before, else the repeat around. */
export function removeStep(document: ProtocolDocument, path: StepPath): Edited {
  if (stepAt(document, path) === null) return { document, path };
  const after = changed(document, parentOf(path), (steps) => spliced(steps, positionOf(path), { remove: 1, put: [] }));
  const left = listAt(after, parentOf(path))?.length ?? 0;
  if (left === 0) return { document: after, path: path.length > 1 ? parentOf(path) : null };
  return { document: after, path: [...parentOf(path), Math.min(positionOf(path), left)] };
}

/** Puts another step in the place of one. */
export function replaceStep(document: ProtocolDocument, path: StepPath, step: Step): Edited {
  if (stepAt(document, path) === null || !fits(step, path.length - 1)) return { document, path };
  return { document: changed(document, parentOf(path), (steps) => spliced(steps, positionOf(path), { remove: 1, put: [step] })), path };
}

/** Puts a copy right after the step; the copy is in hand. */
export function duplicateStep(document: ProtocolDocument, path: StepPath): Edited {
  const step = stepAt(document, path);
  return step === null ? { document, path } : insertStep(document, shifted(path, 1), structuredClone(step));
}

/** Moves the step one row up: past the step before it, into the end of a repeat before it, or out of the repeat it is first in. */
export function moveStepUp(document: ProtocolDocument, path: StepPath): Edited {
  const step = stepAt(document, path);
  if (step === null) return { document, path };
  if (positionOf(path) === 1) return path.length === 1 ? { document, path } : carried(document, path, parentOf(path));
  const before = stepAt(document, shifted(path, -1));
  if (before?.kind === 'repeat' && fits(step, path.length)) return carried(document, path, [...shifted(path, -1), before.steps.length + 1]);
  return carried(document, path, shifted(path, -1));
}

/** Moves the step one row down: past the step after it, into the beginning of a repeat after it, or out of the repeat it is last in. */
export function moveStepDown(document: ProtocolDocument, path: StepPath): Edited {
  const step = stepAt(document, path);
  if (step === null) return { document, path };
  const after = stepAt(document, shifted(path, 1));
  if (after === null) return path.length === 1 ? { document, path } : carried(document, path, shifted(parentOf(path), 1));
  if (after.kind === 'repeat' && fits(step, path.length)) return carried(document, path, [...shifted(path, 1), 1]);
  return carried(document, path, shifted(path, 1));
}

/** Takes the step from one place and puts it to another; `to` is read in the document as it is before, except in the same list. */
function carried(document: ProtocolDocument, from: StepPath, to: StepPath): Edited {
  const step = stepAt(document, from);
  if (step === null) return { document, path: from };
  const without = changed(document, parentOf(from), (steps) => spliced(steps, positionOf(from), { remove: 1, put: [] }));
  const put = insertStep(without, afterRemoval(to, from), step);
  return put.document === without ? { document, path: from } : put;
}

/** Where a place deeper than the list of a removed step is afterwards: steps behind the removed one have moved up. */
function afterRemoval(to: StepPath, removed: StepPath): StepPath {
  const depth = removed.length - 1;
  const sameList = to.length > removed.length && parentOf(removed).every((position, index) => position === to[index]);
  if (!sameList || (to[depth] ?? 0) < positionOf(removed)) return to;
  return to.map((position, index) => (index === depth ? position - 1 : position));
}

/** Puts the step and the `count − 1` after it into a new repeat in their place; the repeat is in hand. */
export function nestInRepeat(
  document: ProtocolDocument,
  path: StepPath,
  options: { count?: number; repeat?: Omit<RepeatStep, 'kind' | 'steps'> } = {},
): Edited {
  const list = listAt(document, parentOf(path));
  const position = positionOf(path);
  const inner = list?.slice(position - 1, position - 1 + (options.count ?? 1)) ?? [];
  const repeat: RepeatStep = { kind: 'repeat', ...(options.repeat ?? { times: 2 }), steps: inner };
  if (position < 1 || inner.length === 0 || !fits(repeat, path.length - 1)) return { document, path };
  return {
    document: changed(document, parentOf(path), (steps) => spliced(steps, position, { remove: inner.length, put: [repeat] })),
    path,
  };
}

/**
 * On a repeat: puts its steps in its place. On a step within a repeat: takes it out, to right after the repeat, which goes when nothing is
 * left in it.
 */
export function unnest(document: ProtocolDocument, path: StepPath): Edited {
  const step = stepAt(document, path);
  if (step?.kind === 'repeat') {
    const after = changed(document, parentOf(path), (steps) => spliced(steps, positionOf(path), { remove: 1, put: step.steps }));
    return { document: after, path: stepAt(after, path) === null ? null : path };
  }
  if (step === null || path.length === 1) return { document, path };
  const parent = parentOf(path);
  const out = carried(document, path, shifted(parent, 1));
  return listAt(out.document, parent)?.length === 0 ? { ...removeStep(out.document, parent), path: parent } : out;
}

/** Changes fields of the document outside its steps; a value of undefined takes the field away. */
export function changeDocument(
  document: ProtocolDocument,
  change: Partial<Omit<ProtocolDocument, 'formatVersion' | 'steps'>>,
): ProtocolDocument {
  const merged = { ...document, ...change };
  return Object.fromEntries(Object.entries(merged).filter(([, value]) => value !== undefined)) as ProtocolDocument;
}
