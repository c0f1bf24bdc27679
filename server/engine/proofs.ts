import { isSound, judgeProof, type ProofFacts } from '@/shared/conditions/proof';
import type { PlannedItem } from '@/shared/protocol/cursor';
import type { ProofStep } from '@/shared/protocol/document';
import { stepDeg } from '@/shared/rig/position-proof';
import type { Draft } from './draft';
import { newRow, stationOf } from './rows';

/** A proof compares what was measured with the plan, at once; what happens where the night is not sound is the step's own policy. */
export function runProof(draft: Draft, item: PlannedItem): 'holding' | 'stopping' | null {
  const { context, start } = draft;
  const { moment } = context;
  const step = item.step as ProofStep;
  const { otherwise = 'hold' } = step;
  const facts = factsOf(draft);
  const items = judgeProof(step, start.rig, facts);
  // Where no deflection comes in live nothing can be said: that is no reason to lose the night.
  const blind = context.dwells.length === 0;
  const sound = isSound(items);
  const row = newRow(draft, { item, station: stationOf(draft), endUtcMs: moment.utcMs });
  draft.openStep({ item, row, plannedMs: 0, motion: null, broken: false });
  draft.closeRow({ at: moment, angleDeg: row.angleStartDeg, outcome: 'done' });
  context.step = null;
  if (blind) {
    draft.log('proof-not-possible', { seq: row.seq, path: row.path, why: 'no deflection came in while the dwells went on' }, moment);
    draft.notify(
      'proved',
      `The proof of step ${item.path} says nothing about the night: no deflection came in while the dwells went on. The run goes on without it.`,
    );
    return null;
  }
  draft.log('proof', { seq: row.seq, path: row.path, sound, otherwise, tests: items }, moment);
  if (sound) {
    draft.notify('proved', `The night is sound: ${items.map(({ words }) => words).join('; ')}.`);
    return null;
  }
  const against = items.filter(({ ok }) => ok !== true).map(({ words }) => words);
  const text = `The proof of step ${item.path} says that the night is not sound: ${against.join('; ')}.`;
  if (otherwise === 'continue') {
    draft.notify('proved', text);
    return null;
  }
  draft.because('proof-failed', otherwise === 'hold' ? `${text} Resuming goes on with the next step.` : text);
  return otherwise === 'stop' ? 'stopping' : 'holding';
}

function factsOf({ context, start }: Draft): ProofFacts {
  const { slip, proved } = context.position.proof;
  const steps = slip?.steps ?? proved?.slipSteps ?? null;
  return {
    near: context.dwells.findLast(({ side }) => side === 'near') ?? null,
    far: context.dwells.findLast(({ side }) => side === 'far') ?? null,
    edgeDeg: steps === null ? null : steps * stepDeg(start.rig),
  };
}
