import type { Draft } from './draft';
import { motionRefusal } from './halting';
import { breakPair } from './pairs';
import { chooseNext } from './steps';

/** Leaving out the rest of a step that stands, reviewed by a person. */

/** Why the rest of the step `seq` may not be left out now; null where it may. A motion may follow, so all that a motion needs counts. */
export function skipRefusal(draft: Draft): string | null {
  const { seq, arm } = draft.told('skip');
  const { step, ahead, holdAfterStep } = draft.context;
  if (step === null || (step.row.outcome !== null && !step.broken)) return 'No step is under way: resume goes on with the next one.';
  if (step.row.kind === 'prompt') return 'A prompt is not left out: arm the rig again and confirm it.';
  if (step.pause === true) return 'The sources are between two moves of one step, which cannot be left out.';
  if (step.motion !== null) return 'A motion cannot be left out: the sources would not stand where the next step measures.';
  if (step.row.seq !== seq) return 'The step that was reviewed is over. Look at the run again.';
  if (holdAfterStep !== null) return `${holdAfterStep} asked to hold after this step. Withdraw that first, or hold now.`;
  if (ahead !== null) return 'The step ends by itself within 2 s: its next move is on the way already.';
  return motionRefusal(draft, draft.start.simulated === null ? arm : 'simulated', null);
}

export function noteRefusedSkip(draft: Draft): void {
  draft.log('skip-refused', {
    by: draft.told('skip').by,
    why: skipRefusal(draft) ?? 'Nothing can be left out now. Look at the run again.',
  });
}

/** The step ends here and now, its row says `skipped`, and the next step begins; the cadence starts anew. */
export function skip(draft: Draft): void {
  const { by, arm } = draft.told('skip');
  const { context } = draft;
  const { row } = draft.step;
  const { seq, path, kind } = row;
  draft.log('skipped', { seq, path, kind, by, arm }, draft.event.at);
  const angleDeg = draft.controller.angleDeg ?? row.angleStartDeg;
  draft.closeRow({ at: draft.event.at, angleDeg, outcome: 'skipped' });
  // Of a held run it is closed already.
  Object.assign(row, { outcome: 'skipped', good: kind === 'dwell' ? false : row.good });
  draft.saveRow(row);
  context.position.dwells = context.position.dwells.filter((dwell) => dwell.seq !== seq);
  if (kind === 'dwell') {
    breakPair(draft, row);
    context.dwellJustNotGood = true;
    context.dwells = context.dwells.filter((dwell) => dwell.seq !== seq);
  }
  context.waiting = null;
  draft.standAt(draft.event.at, angleDeg ?? context.moment.angleDeg);
  Object.assign(context, {
    arm,
    armVoid: null,
    interruption: null,
    reason: null,
    haltedAtUtcMs: null,
    onCadence: false,
    swingStartUtcMs: null,
    swungFromDeg: null,
  });
  context.intervention = { kind: 'skip', by, serverAtUtcMs: draft.nowUtcMs, confirmedAtUtcMs: null, commandId: null };
  chooseNext(draft);
  if (context.next === 'standing') context.intervention.confirmedAtUtcMs = draft.nowUtcMs;
}
