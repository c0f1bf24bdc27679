import type { RigDocument } from '../rig/document';
import { greatestStepCount } from './cursor';
import type { ProtocolDocument, RepeatStep, SettleStep, Step, WaitStep } from './document';
import type { Finding } from './finding';
import { walkSteps } from './step-path';

/** Repeats nest at most this deep. */
export const greatestNesting = 4;

/** Longest local day: 25 h, when the clocks go back. */
const longestDayS = 90_000;

/** Findings about the tree of steps that need no knowledge of where the sources stand. */
export function structureFindings(document: ProtocolDocument, rig: RigDocument): Finding[] {
  if (document.steps.length === 0) {
    return [{ code: 'no-steps', path: null, message: 'The protocol has no steps. It needs at least one, and usually begins with home.' }];
  }
  const findings: Finding[] = [];
  for (const { step, path, depth } of walkSteps(document.steps)) {
    if (step.kind === 'repeat') findings.push(...repeatFindings(step, path, { depth, rig }));
    for (const message of fieldMessages(step)) findings.push({ code: 'field-not-used', path, message });
  }
  return nestsTooDeep(document) ? findings : [...findings, ...countFindings(document, rig)];
}

/** Do repeats nest deeper than 4? */
export function nestsTooDeep(document: ProtocolDocument): boolean {
  return [...walkSteps(document.steps)].some(({ step, depth }) => step.kind === 'repeat' && depth >= greatestNesting);
}

function repeatFindings(step: RepeatStep, path: string, { depth, rig }: { depth: number; rig: RigDocument }): Finding[] {
  const findings: Finding[] = [];
  if (depth === greatestNesting)
    findings.push({
      code: 'nested-too-deep',
      path,
      message: `Repeats nest at most ${greatestNesting} deep, and this one stands inside ${depth} others. Take it out of one of them.`,
    });
  if (step.steps.length === 0)
    findings.push({ code: 'no-steps', path, message: 'The repeat holds no steps. Put at least one into it, or remove it.' });
  else if (step.until !== undefined && 'localTime' in step.until && depth < greatestNesting && leastDurationS(step.steps, rig) === 0) {
    findings.push({
      code: 'endless-repeat',
      path,
      message: 'The steps in this repeat may take no time at all, so it could go round without end. Put a dwell or a settle into it.',
    });
  }
  const needsAtMost = step.counting === 'good' || (step.until !== undefined && 'relativeStatisticalU' in step.until);
  if (needsAtMost && step.atMost === undefined)
    findings.push({
      code: 'field-missing',
      path,
      message: 'atMost is missing: without it the number of passes has no bound. It takes a whole number from 1.',
    });
  return findings;
}

/** Fields that would have no effect beside the others: a bound that nobody keeps is refused rather than passed over. */
function fieldMessages(step: Step): string[] {
  if (step.kind === 'settle') return settleMessages(step);
  if (step.kind === 'wait') return waitMessages(step);
  return step.kind === 'repeat' ? repeatMessages(step) : [];
}

const given = (step: Record<string, unknown>, names: readonly string[]) => names.filter((name) => step[name] !== undefined);

function settleMessages(step: SettleStep): string[] {
  if (step.calmWhen !== undefined) return [];
  return given(step, ['atMost_s', 'otherwise']).map((name) => `${name} goes with calmWhen and has no effect beside for_s. Leave it out.`);
}

function waitMessages(step: WaitStep): string[] {
  if (!('localTime' in step.until)) return [];
  return given(step, ['atMost_s', 'otherwise']).map(
    (name) =>
      `${name} goes with a wait for a channel and has no effect beside localTime. Leave it out; ifPast says what to do when the time is past.`,
  );
}

function repeatMessages(step: RepeatStep): string[] {
  const byU = step.until !== undefined && 'relativeStatisticalU' in step.until;
  const messages: string[] = [];
  if (step.atLeast !== undefined && !byU)
    messages.push('atLeast goes with until relativeStatisticalU and has no effect here. Leave it out.');
  if (step.atMost !== undefined && !byU && step.counting !== 'good')
    messages.push('atMost goes with until relativeStatisticalU or with counting "good" and has no effect here. Leave it out.');
  if (step.counting === 'good' && step.times === undefined)
    messages.push('counting "good" counts towards times, which is not given. Leave it out, or give times.');
  return messages;
}

function countFindings(document: ProtocolDocument, rig: RigDocument): Finding[] {
  const counts = document.steps.map((step, index) => ({ path: `${index + 1}.${step.kind}`, count: executedCount(step, rig) }));
  const total = counts.reduce((sum, { count }) => sum + count, 0);
  if (total <= greatestStepCount) return [];
  const largest = counts.reduce((a, b) => (b.count > a.count ? b : a));
  const amount = total < 1e9 ? `up to ${total.toLocaleString('en-GB')}` : 'more than a thousand million';
  return [
    {
      code: 'too-many-steps',
      path: largest.path,
      message: `The protocol would execute ${amount} steps; at most 10,000 are accepted. Lower the number of passes here.`,
    },
  ];
}

/** Greatest number of executed steps. */
function executedCount(step: Step, rig: RigDocument): number {
  if (step.kind !== 'repeat') return 1;
  const inside = step.steps.reduce((sum, child) => sum + executedCount(child, rig), 0);
  return inside === 0 ? 0 : inside * greatestPasses(step, rig);
}

function greatestPasses(step: RepeatStep, rig: RigDocument): number {
  if (step.times !== undefined) return step.counting === 'good' ? (step.atMost ?? step.times) : step.times;
  if (step.until !== undefined && 'localTime' in step.until) return Math.floor(longestDayS / Math.max(leastDurationS(step.steps, rig), 1));
  return step.atMost ?? 1;
}

/** Least time that a list of steps takes by plan, s: moves count as none, a beat as all of it, for the swing before it is in it. */
function leastDurationS(steps: readonly Step[], rig: RigDocument): number {
  return steps.reduce((sum, step) => sum + leastStepS(step, rig), 0);
}

function leastStepS(step: Step, rig: RigDocument): number {
  const periodS = rig.measured?.period_s?.value ?? 0;
  if (step.kind === 'dwell') return step.for_s ?? (step.periods ?? step.beat_periods ?? 0) * periodS;
  if (step.kind === 'settle') return step.for_s ?? 0;
  if (step.kind === 'repeat') return (step.times ?? 0) * leastDurationS(step.steps, rig);
  return 0;
}
