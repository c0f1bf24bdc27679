import { oscillatorOf } from '../physics/oscillator';
import type { RigDocument } from '../rig/document';
import type { ProtocolDocument, Step } from './document';
import type { Finding } from './finding';
import { sideAt } from './stations';
import { walkSteps } from './step-path';
import { planTimeline } from './timeline';
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

/**
 * A proof compares the last near and the last far dwell before it: where it is met first, both must have been. Within a repeat that is shuffled
 * the other children may all come after it.
 */
function proofFindings(document: ProtocolDocument, rig: RigDocument): Finding[] {
  if (![...walkSteps(document.steps)].some(({ step }) => step.kind === 'proof')) return [];
  const { items } = planTimeline({ protocol: document, rig, timeZone: 'UTC' }, { utcMs: 0, angleDeg: rig.motion?.homeDeg ?? 0 });
  const shuffled = [...walkSteps(document.steps)].flatMap(({ step, path }) =>
    step.kind === 'repeat' && step.order === 'shuffled' ? [`${path}.`] : [],
  );
  const before: { documentPath: string; side: 'near' | 'far' | null }[] = [];
  const refused = new Set<string>();
  for (const { kind, documentPath, angleToDeg } of items) {
    if (kind === 'dwell') before.push({ documentPath, side: sideAt(rig, angleToDeg) });
    if (kind !== 'proof') continue;
    const sure = before.filter((dwell) => shuffled.every((repeat) => isSurelyBefore(dwell.documentPath, { documentPath, repeat })));
    if (!sure.some(({ side }) => side === 'near') || !sure.some(({ side }) => side === 'far')) refused.add(documentPath);
  }
  return [...refused].map((path) => ({
    code: 'proof-needs-pair',
    path,
    message:
      'A proof compares the last near and the last far dwell before it, and there is no such pair. Put a near and a far dwell before it.',
  }));
}

/** Not in another child of the shuffled repeat that the proof stands in. */
function isSurelyBefore(dwellPath: string, { documentPath, repeat }: { documentPath: string; repeat: string }): boolean {
  if (!documentPath.startsWith(repeat) || !dwellPath.startsWith(repeat)) return true;
  const childOf = (path: string) => path.slice(repeat.length).split('.', 1)[0];
  return childOf(dwellPath) === childOf(documentPath);
}
