import { formatDegrees } from '@/shared/lib/format-angle';
import { rotationHomeDeg } from '@/shared/protocol/step-parts';
import { isWound } from '@/shared/protocol/homing';
import { freeTurns } from '@/shared/rig/travel';
import type { Draft } from './draft';
import { toleranceDeg } from './rows';

/** What a rotation that is broken off leaves wound up. Only a resumed run or a person at the rig turns it back. */

/** Where the rotation that is under way, or whose way back is still to come, began, deg; null where there is none. */
function rotationBegan({ context: { step, cursor } }: Draft): number | null {
  const [next] = cursor.parts ?? [];
  const toCome = next === undefined ? null : rotationHomeDeg(next);
  return toCome ?? (step?.motion == null ? null : rotationHomeDeg(step.item));
}

/** What a person does before the rig is homed where a rotation may have left its cables wound up; null where there is no need. */
export function lostWords(draft: Draft): string | null {
  return rotationBegan(draft) === null
    ? null
    : 'look at its cables, which the rotation may have left wound up: turn the table back by nudges (first move, on the link page), then home it there.';
}

/** Tells people, with why the run came to rest, how far out the sources stand. `over`: this run will not turn them back any more. */
export function noteWound(draft: Draft, as: 'held' | 'over'): void {
  const { context, start } = draft;
  const beganDeg = rotationBegan(draft);
  const { motion } = start.rig;
  if (beganDeg === null || motion === undefined || freeTurns(motion) === 0) return;
  const { code, text } = context.reason ?? { code: as === 'held' ? 'held' : 'stopped', text: '' };
  const angleDeg = context.controller?.positionKnown === true ? context.controller.angleDeg : null;
  if (angleDeg !== null && Math.abs(angleDeg - beganDeg) <= toleranceDeg(draft)) return;
  draft.because(code, `${text} ${woundWords(angleDeg, { as, beganDeg, isOut: angleDeg !== null && isWound(motion, angleDeg) })}`.trim());
  draft.log('rotation-broken-off', { angleDeg, beganDeg, turnsOut: angleDeg === null ? null : (angleDeg - beganDeg) / 360 });
}

interface Wound {
  as: 'held' | 'over';
  beganDeg: number;
  isOut: boolean;
}

function woundWords(angleDeg: number | null, { as, beganDeg, isOut }: Wound): string {
  if (angleDeg === null)
    return 'It was in a rotation, so its cables may be wound up: look at them, and turn the table back by nudges before it is homed.';
  const turns = Math.abs(angleDeg - beganDeg) / 360;
  const stands = `The sources stand at ${formatDegrees(angleDeg)}, ${turns.toFixed(2)} turns from where the rotation began.`;
  if (as === 'held') return `${stands} Resumed, it goes on and turns back at its end.`;
  return isOut ? `${stands} Turn them back by nudges (first move, on the link page) before the next run.` : stands;
}
