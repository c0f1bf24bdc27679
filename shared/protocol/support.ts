import type { ProtocolDocument, Step } from './document';
import type { Finding } from './finding';
import { walkSteps } from './step-path';

/**
 * What of the format this version carries out. The rest is valid in the schema and refused here with `not-yet`, so that a document
 * written for a later version is never run by half.
 */

const builtKinds = new Set<Step['kind']>(['home', 'swing', 'dwell', 'kick', 'settle', 'wait', 'proof', 'mark', 'prompt', 'repeat']);

/** Is the step kind carried out by this version? */
export function isBuilt(kind: Step['kind']): boolean {
  return builtKinds.has(kind);
}

/** Everything in the document that this version does not carry out, with the step's path and what can be used instead. */
export function notYet(document: ProtocolDocument): Finding[] {
  return [...walkSteps(document.steps)].flatMap(({ step, path }) =>
    stepNotYet(step).map((message): Finding => ({ code: 'not-yet', path, message })),
  );
}

function stepNotYet(step: Step): string[] {
  switch (step.kind) {
    case 'mark':
      return step.frame === true ? ['Camera frames are not built yet. Set frame to false or leave it out.'] : [];
    default:
      return isBuilt(step.kind) ? [] : [`The step kind "${step.kind}" is not built yet. Built are: ${[...builtKinds].join(', ')}.`];
  }
}
