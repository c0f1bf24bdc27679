import type { ProtocolDocument, Step } from './document';

/** Where a step stands: 1-based positions from the outermost list inwards; `[2, 1]` is the first step of the second. */
export type StepPath = readonly number[];

/** `2.repeat.1.swing` for the steps met on the way to `path`; null where there is no such step. */
export function formatStepPath(document: Pick<ProtocolDocument, 'steps'>, path: StepPath): string | null {
  const parts: string[] = [];
  let steps: readonly Step[] = document.steps;
  for (const position of path) {
    const step = steps[position - 1];
    if (step === undefined) return null;
    parts.push(`${position}.${step.kind}`);
    steps = step.kind === 'repeat' ? step.steps : [];
  }
  return parts.length === 0 ? null : parts.join('.');
}

/** The positions in a document path or in the path of a run (`2.repeat[3].1.swing`, `.a` for a move of it); null for anything else, such as `atEnd`. */
export function parseStepPath(path: string): StepPath | null {
  if (!/^[1-9]\d*\.\w+(\[\d+\])?(\.[1-9]\d*\.\w+(\[\d+\])?)*(\.[a-z]{1,2})?$/.test(path)) return null;
  return path
    .replace(/\.[a-z]{1,2}$/, '')
    .split('.')
    .filter((_, index) => index % 2 === 0)
    .map(Number);
}

/** The step at `path`, or null. */
export function stepAt(document: Pick<ProtocolDocument, 'steps'>, path: StepPath): Step | null {
  let steps: readonly Step[] = document.steps;
  let found: Step | null = null;
  for (const position of path) {
    found = steps[position - 1] ?? null;
    if (found === null) return null;
    steps = found.kind === 'repeat' ? found.steps : [];
  }
  return found;
}

export interface VisitedStep {
  step: Step;
  /** `2.repeat.1.swing` */
  path: string;
  positions: StepPath;
  /** Number of repeats around the step. */
  depth: number;
}

/** Every step of the document in reading order, repeats before what they hold. */
export function* walkSteps(
  steps: readonly Step[],
  around: { prefix: string; positions: StepPath } = { prefix: '', positions: [] },
): Generator<VisitedStep> {
  for (const [index, step] of steps.entries()) {
    const path = `${around.prefix}${index + 1}.${step.kind}`;
    const positions = [...around.positions, index + 1];
    yield { step, path, positions, depth: around.positions.length };
    if (step.kind === 'repeat') yield* walkSteps(step.steps, { prefix: `${path}.`, positions });
  }
}
