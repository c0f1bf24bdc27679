import { homingObstacle, isWound } from '@/shared/protocol/homing';
import type { RigDocument, RigMotion } from '@/shared/rig/document';
import { keepOutEntered } from '@/shared/rig/travel';
import type { TurntableLink } from '../interfaces/turntable-link';

/** What a person at the rig may order in a guided first move, and what stands against it. */

export interface GuidedRig {
  labId: string;
  rigId: string;
  name: string;
  document: RigDocument;
  motion: RigMotion;
}

export type GuidedRefusalCode = 'rig-busy' | 'locked' | 'not-armed' | 'not-ready' | 'not-possible-now' | 'invalid-input';

/** An order that is refused, with a sentence that says what would be right. */
export class GuidedRefused extends Error {
  constructor(
    readonly code: GuidedRefusalCode,
    message: string,
    /** The field of the request that is meant, if one is. */
    readonly field?: string,
  ) {
    super(message);
  }
}

export type GuidedRequest = MoveRequest | { kind: 'teach' };

/** `intoKeepOut`: whoever orders looks at the gap and means to go into an arc that is kept out of runs. */
export type MoveRequest = { kind: 'home'; intoKeepOut: boolean } | { kind: 'nudge'; steps: number; intoKeepOut: boolean };

/** The longest nudge that the controller takes, microsteps (SPEC 8.9): a 36th of its soft travel, rounded up. */
export function longestNudgeSteps(motion: RigMotion, link: TurntableLink): number {
  const limits = link.limits();
  const travelDeg = limits === null ? motion.maxDeg - motion.minDeg : limits.greatestDeg - limits.leastDeg;
  return Math.ceil(Number(((travelDeg * motion.stepsPerDegree) / 36).toFixed(6)));
}

/** @throws GuidedRefused */
export function assertNudge(
  motion: RigMotion,
  link: TurntableLink,
  { steps, intoKeepOut }: Extract<GuidedRequest, { kind: 'nudge' }>,
): void {
  const longest = longestNudgeSteps(motion, link);
  if (!Number.isInteger(steps) || steps === 0 || Math.abs(steps) > longest)
    throw new GuidedRefused(
      'invalid-input',
      `A nudge of ${String(steps)} microsteps is not taken: a whole number from 1 to ${String(longest)}, either way, is (a 36th of the travel that the controller has).`,
      'steps',
    );
  const angleDeg = link.controller()?.angleDeg ?? null;
  if (angleDeg === null || intoKeepOut) return;
  const met = keepOutEntered(motion, angleDeg, angleDeg + steps / motion.stepsPerDegree);
  if (met !== null)
    throw new GuidedRefused(
      'not-possible-now',
      `This nudge would enter what is kept out of runs: ${met}. Say that you look at the gap, or turn the other way.`,
    );
}

/** Homing turns by itself, with masses on the table perhaps: where it might not turn towards the middle somebody has to look. @throws GuidedRefused */
export function assertHoming(
  { document, motion }: Pick<GuidedRig, 'document' | 'motion'>,
  link: TurntableLink,
  { intoKeepOut }: Extract<GuidedRequest, { kind: 'home' }>,
): void {
  const angleDeg = link.controller()?.angleDeg ?? null;
  // No look at the gap makes the turns undone that the flag does not count.
  const mayLook = angleDeg === null || !isWound(motion, angleDeg);
  const obstacle = intoKeepOut && mayLook ? null : homingObstacle(document, angleDeg);
  if (obstacle !== null)
    throw new GuidedRefused(
      'not-possible-now',
      `The rig does not home by itself: ${obstacle}.${mayLook ? ' Say that you look at the gap, or correct the rig document.' : ''}`,
    );
}
