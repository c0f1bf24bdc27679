import type { ProtocolDocument, RepeatStep, SettleStep, Step, SwingStep, WaitStep } from './document';
import type { Finding } from './finding';
import { walkSteps } from './step-path';

/**
 * What of the format this version carries out. The rest is valid in the schema and refused here with `not-yet`, so that a document
 * written for a later version is never run by half.
 */

const builtKinds = new Set<Step['kind']>(['home', 'swing', 'dwell', 'settle', 'wait', 'mark', 'repeat']);

/** Is the step kind carried out by this version? */
export function isBuilt(kind: Step['kind']): boolean {
  return builtKinds.has(kind);
}

/** Everything in the document that this version does not carry out, with the step's path and what can be used instead. */
export function notYet(document: ProtocolDocument): Finding[] {
  return [
    ...documentNotYet(document),
    ...[...walkSteps(document.steps)].flatMap(({ step, path }) => stepNotYet(step).map((message) => finding(path, message))),
  ];
}

const finding = (path: string | null, message: string): Finding => ({ code: 'not-yet', path, message });

function documentNotYet({ goodWhen, evaluation }: ProtocolDocument): Finding[] {
  const findings: Finding[] = [];
  if (goodWhen !== undefined)
    findings.push(finding('goodWhen', 'goodWhen is not built yet. Leave it out; exclusions can be made in the data afterwards.'));
  if (evaluation?.method === 'modulation')
    findings.push(
      finding('evaluation', 'The evaluation method "modulation" is not built yet. Use "equilibrium", "acceleration" or "period".'),
    );
  return findings;
}

function stepNotYet(step: Step): string[] {
  switch (step.kind) {
    case 'swing':
      return swingNotYet(step);
    case 'settle':
      return settleNotYet(step);
    case 'wait':
      return waitNotYet(step);
    case 'mark':
      return step.frame === true ? ['Camera frames are not built yet. Set frame to false or leave it out.'] : [];
    case 'repeat':
      return repeatNotYet(step);
    default:
      return isBuilt(step.kind) ? [] : [`The step kind "${step.kind}" is not built yet. Built are: ${[...builtKinds].join(', ')}.`];
  }
}

function swingNotYet({ profile }: SwingStep): string[] {
  return profile === 'shaped' ? ['The swing profile "shaped" is not built yet. Use "plain".'] : [];
}

function settleNotYet({ calmWhen }: SettleStep): string[] {
  return calmWhen === undefined ? [] : ['Settling until calm (calmWhen) is not built yet. Give the time to wait as for_s.'];
}

function waitNotYet({ until }: WaitStep): string[] {
  return 'localTime' in until
    ? []
    : [`Waiting for the channel "${until.channel}" is not built yet. Wait until a localTime, or settle for a fixed time.`];
}

function repeatNotYet({ until, counting, order }: RepeatStep): string[] {
  const messages: string[] = [];
  if (until !== undefined && 'relativeStatisticalU' in until) {
    messages.push('Repeating until relativeStatisticalU is reached is not built yet. Give times, or until a localTime.');
  }
  if (counting === 'good') messages.push('Counting only good passes is not built yet. Use counting "all".');
  if (order === 'shuffled') messages.push('The order "shuffled" is not built yet. Use "as written".');
  return messages;
}
