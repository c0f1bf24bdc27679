import { oscillatorOf } from '../physics/oscillator';
import type { RigDocument } from '../rig/document';
import type { ProtocolDocument, Step } from './document';
import type { Finding } from './finding';
import { sideAt } from './stations';
import { walkSteps } from './step-path';
import { planTimeline, type TimelineItem } from './timeline';
import { isCalm, waitOf } from './wait';

/** A window has to hold so large a part of a period for the swing to be told from the drift. */
const LEAST_PERIODS = 0.4;

/** Conditions that could never be met, and proofs without a pair before them. */
export function conditionFindings(document: ProtocolDocument, rig: RigDocument): Finding[] {
  const steps = [...walkSteps(document.steps)];
  return [...steps.flatMap(({ step, path }) => waitFindings(step, path, rig)), ...proofFindings(document, rig)];
}

function waitFindings(step: Step, path: string, rig: RigDocument): Finding[] {
  const wait = waitOf(step);
  if (wait === null) return [];
  const findings: Finding[] = [];
  if (wait.atMostS < wait.windowS)
    findings.push({
      code: 'never-met',
      path,
      message: `The condition has to hold for ${wait.windowS} s, and the step gives up after ${wait.atMostS} s. atMost_s takes a number from ${wait.windowS}.`,
    });
  if (!isCalm(step)) return findings;
  const oscillator = oscillatorOf(rig);
  if (oscillator === null) {
    findings.push({
      code: 'period-missing',
      path,
      message:
        'Settling until calm needs measured.period_s and measured.decayTime_s in the rig document. Measure them, or give the time to wait as for_s.',
    });
  } else if (wait.windowS < LEAST_PERIODS * oscillator.periodS) {
    const least = Math.ceil(LEAST_PERIODS * oscillator.periodS);
    findings.push({
      code: 'window-short',
      path,
      message: `In a window of ${wait.windowS} s the swing of the pendulum cannot be told from its drift. window_s takes a number from ${least}, ${LEAST_PERIODS} of its period.`,
    });
  }
  return findings;
}

type Side = 'near' | 'far' | null;

/** What is met on the way, and where it stands in the plan and in the document. */
type Met = Pick<TimelineItem, 'path' | 'documentPath'>;

/** A repeat that is shuffled. */
interface Shuffled {
  /** In the document, with the point that follows: `2.repeat.` */
  prefix: string;
  /** Where each child that moves the sources leaves them, by its place. */
  ends: ReadonlyMap<string, Side>;
}

/**
 * A proof compares the last near and the last far dwell before it: where it is met first, both must have been, in whatever order the children
 * of a shuffled repeat come.
 */
function proofFindings(document: ProtocolDocument, rig: RigDocument): Finding[] {
  if (![...walkSteps(document.steps)].some(({ step }) => step.kind === 'proof')) return [];
  const { items } = planTimeline({ protocol: document, rig, timeZone: 'UTC' }, { utcMs: 0, angleDeg: rig.motion?.homeDeg ?? 0 });
  const moves = items.filter(({ kind }) => kind === 'swing' || kind === 'home');
  const shuffled = [...walkSteps(document.steps)].flatMap(({ step, path }): Shuffled[] => {
    if (step.kind !== 'repeat' || step.order !== 'shuffled') return [];
    const prefix = `${path}.`;
    const own = moves.filter(({ documentPath }) => documentPath.startsWith(prefix));
    return [{ prefix, ends: new Map(own.map((move) => [childOf(move.documentPath, prefix), sideAt(rig, move.angleToDeg)])) }];
  });
  const before: (Met & { side: Side })[] = [];
  const refused = new Set<string>();
  let move: Met | null = null;
  for (const item of items) {
    if (item.kind === 'swing' || item.kind === 'home') move = item;
    const broughtBy = move;
    if (item.kind === 'dwell' && shuffled.every((repeat) => isSideSure(item, broughtBy, repeat)))
      before.push({ ...item, side: sideAt(rig, item.angleToDeg) });
    if (item.kind !== 'proof') continue;
    const sure = before.filter((dwell) => shuffled.every((repeat) => isSurelyBefore(dwell, item, repeat)));
    if (!sure.some(({ side }) => side === 'near') || !sure.some(({ side }) => side === 'far')) refused.add(item.documentPath);
  }
  return [...refused].map((path) => ({
    code: 'proof-needs-pair',
    path,
    message:
      'A proof compares the last near and the last far dwell before it, and there is no such pair. Put a near and a far dwell before it.',
  }));
}

/** Whether the sources stand there in every order: a child that does not move them finds them where another has left them. */
function isSideSure(dwell: Met, broughtBy: Met | null, { prefix, ends }: Shuffled): boolean {
  if (dwell.documentPath.startsWith(prefix))
    return ends.size === 0 || (broughtBy !== null && childOf(broughtBy.path, prefix) === childOf(dwell.path, prefix));
  return broughtBy?.documentPath.startsWith(prefix) !== true || new Set(ends.values()).size === 1;
}

/** Not in another child of the shuffled repeat that the proof stands in. */
function isSurelyBefore(dwell: Met, proof: Met, { prefix }: Shuffled): boolean {
  if (!proof.documentPath.startsWith(prefix) || !dwell.documentPath.startsWith(prefix)) return true;
  return childOf(dwell.documentPath, prefix) === childOf(proof.documentPath, prefix);
}

/** `2.repeat.1` of `2.repeat.1.repeat.3.dwell`, and `2.repeat[4].1` of the same in a plan, for the repeat `2.repeat.` */
const childOf = (path: string, prefix: string): string => path.split('.').slice(0, prefix.split('.').length).join('.');
