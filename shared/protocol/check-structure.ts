import type { RigDocument } from '../rig/document';
import { greatestStepCount } from './cursor';
import type { ProtocolDocument, RepeatStep, Step } from './document';
import type { Finding } from './finding';
import { leastPlan } from './least-plan';
import { MOST_SHUFFLED, shuffledChildren } from './shuffle';
import { walkSteps } from './step-path';

/** Repeats nest at most this deep. */
export const greatestNesting = 4;

/** Longest protocol, s: a leap year. Longer ones are slips of the pen, and their ends are no dates. */
const greatestLengthS = 366 * 86_400;

/** Findings about the tree of steps that need no knowledge of where the sources stand. */
export function structureFindings(document: ProtocolDocument, rig: RigDocument): Finding[] {
  if (document.steps.length === 0) {
    return [{ code: 'no-steps', path: null, message: 'The protocol has no steps. It needs at least one, and usually begins with home.' }];
  }
  const repeats = [...walkSteps(document.steps)].flatMap(({ step, path, depth }) =>
    step.kind === 'repeat' ? repeatFindings(step, path, depth) : [],
  );
  if (nestsTooDeep(document)) return repeats;
  return [...repeats, ...endlessFindings(document, rig), ...countFindings(document), ...lengthFindings(document, rig)];
}

/** Do repeats nest deeper than 4? */
export function nestsTooDeep(document: ProtocolDocument): boolean {
  return [...walkSteps(document.steps)].some(({ step, depth }) => step.kind === 'repeat' && depth >= greatestNesting);
}

function repeatFindings(step: RepeatStep, path: string, depth: number): Finding[] {
  const findings: Finding[] = [];
  if (depth === greatestNesting)
    findings.push({
      code: 'nested-too-deep',
      path,
      message: `Repeats nest at most ${greatestNesting} deep, and this one stands inside ${depth} others. Take it out of one of them.`,
    });
  if (step.steps.length === 0)
    findings.push({ code: 'no-steps', path, message: 'The repeat holds no steps. Put at least one into it, or remove it.' });
  const loose = step.order === 'shuffled' ? step.steps.findIndex(({ kind }) => kind !== 'repeat') : -1;
  if (loose >= 0)
    findings.push({
      code: 'shuffle-needs-repeats',
      path,
      message: `The order "shuffled" takes repeats alone, so that what belongs together stays together, and step ${path}.${loose + 1}.${step.steps[loose]?.kind ?? ''} is none. Put it into a repeat of 1 time, or leave the order as written.`,
    });
  const children = step.order === 'shuffled' ? shuffledChildren(step) : 0;
  if (children > MOST_SHUFFLED)
    findings.push({
      code: 'too-many-children',
      path,
      message: `The order "shuffled" takes up to ${MOST_SHUFFLED} repeats, those of shuffled repeats inside it counted too, and these are ${children}. Take some of them together into one repeat.`,
    });
  const byU = step.until !== undefined && 'relativeStatisticalU' in step.until;
  const needsAtMost = step.counting === 'good' || byU;
  if (needsAtMost && step.atMost === undefined)
    findings.push({
      code: 'field-missing',
      path,
      message: 'atMost is missing: without it the number of passes has no bound. It takes a whole number from 1.',
    });
  const least = step.counting === 'good' ? step.times : byU ? step.atLeast : undefined;
  if (step.atMost !== undefined && least !== undefined && least > step.atMost)
    findings.push({
      code: 'bounds-crossed',
      path,
      message: `atMost is ${step.atMost}, fewer than the ${least} passes that are asked for. It takes a whole number from ${least}.`,
    });
  return findings;
}

function endlessFindings(document: ProtocolDocument, rig: RigDocument): Finding[] {
  return [...walkSteps(document.steps)].flatMap(({ step, path }) =>
    step.kind === 'repeat' && step.times === undefined && step.steps.length > 0 && takesNoTime(step, rig)
      ? [
          {
            code: 'endless-repeat',
            path,
            message: 'The steps in this repeat take no time at all, so it would go round without end. Put a dwell or a settle into it.',
          },
        ]
      : [],
  );
}

/** From the second pass on: nothing but marks, and swings to where the sources stand already. */
function takesNoTime(repeat: RepeatStep, rig: RigDocument): boolean {
  if ([...walkSteps(repeat.steps)].some(({ step }) => !['mark', 'swing', 'repeat'].includes(step.kind))) return false;
  const first = leastPlan(repeat.steps, rig, null);
  return leastPlan(repeat.steps, rig, first.angleDeg).durationS === 0;
}

/** Steps that are executed in any case; how often a repeat until a time goes round is known only when the run starts. */
function countFindings(document: ProtocolDocument): Finding[] {
  const counts = document.steps.map((step, index) => ({ path: `${index + 1}.${step.kind}`, count: executedCount(step) }));
  const last = document.atEnd?.station === undefined ? 0 : 1;
  const total = counts.reduce((sum, { count }) => sum + count, last);
  if (total <= greatestStepCount) return [];
  const largest = counts.reduce((a, b) => (b.count > a.count ? b : a));
  const amount = total < 1e9 ? total.toLocaleString('en-GB') : 'more than a thousand million';
  return [
    {
      code: 'too-many-steps',
      path: largest.path,
      message: `The protocol would execute ${amount} steps; at most 10,000 are accepted. Lower the number of passes here.`,
    },
  ];
}

function executedCount(step: Step): number {
  if (step.kind !== 'repeat') return 1;
  const inside = step.steps.reduce((sum, child) => sum + executedCount(child), 0);
  return inside === 0 ? 0 : inside * passes(step);
}

function passes({ times, until, counting, atMost }: RepeatStep): number {
  if (until !== undefined && 'relativeStatisticalU' in until) return atMost ?? 1;
  if (times === undefined) return 1;
  return counting === 'good' ? (atMost ?? times) : Math.min(times, atMost ?? times);
}

function lengthFindings({ steps }: ProtocolDocument, rig: RigDocument): Finding[] {
  if (leastPlan(steps, rig, null).durationS <= greatestLengthS) return [];
  let angleDeg: number | null = null;
  let longest = { path: '', durationS: -1 };
  for (const [index, step] of steps.entries()) {
    const after = leastPlan([step], rig, angleDeg);
    if (after.durationS > longest.durationS) longest = { path: `${index + 1}.${step.kind}`, durationS: after.durationS };
    angleDeg = after.angleDeg;
  }
  return [
    {
      code: 'too-long',
      path: longest.path,
      message: 'The protocol would take more than 366 days. Accepted is up to that; shorten this step.',
    },
  ];
}
