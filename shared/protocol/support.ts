import type { ProtocolDocument, Step } from './document';
import type { Finding } from './finding';
import { walkSteps } from './step-path';

/**
 * What of the format this version carries out. The rest is valid in the schema and refused here with `not-yet`, so that a document
 * written for a later version is never run by half.
 */

/** Everything in the document that this version does not carry out, with the step's path and what can be used instead. */
export function notYet(document: ProtocolDocument): Finding[] {
  return [...walkSteps(document.steps)].flatMap(({ step, path }) =>
    stepNotYet(step).map((message): Finding => ({ code: 'not-yet', path, message })),
  );
}

function stepNotYet(step: Step): string[] {
  return step.kind === 'mark' && step.frame === true ? ['Camera frames are not built yet. Set frame to false or leave it out.'] : [];
}
