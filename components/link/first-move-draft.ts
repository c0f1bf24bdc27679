import { useState } from 'react';
import { readDecimal } from '@/components/ui/read-decimal';
import type { GuidedView } from '@/shared/contracts/link';
import { stepsPerDegreeOf, turnProblem, type StepsPerDegree, type TurnReading } from '@/shared/rig/steps-per-degree';
import { usualMarginDeg, type TaughtTravel } from '@/shared/rig/travel';

/** What a person has done and typed on the page of the first move; it stays while steps are looked at in any order. */

export type FirstMoveStep = 'direction' | 'steps' | 'travel' | 'limits';

export interface FirstMoveDraft {
  step: FirstMoveStep;
  nudgeSteps: string;
  intoKeepOut: boolean;
  /** Which way the table turned against what was asked; null until it was said. */
  direction: 'right' | 'wrong' | 'still' | null;
  method: 'mark' | 'edge';
  /** The count at the first mark. */
  mark: GuidedView['count'] | null;
  turnedDeg: string;
  uDeg: string;
  edgeDeg: string;
  edgeUDeg: string;
  readings: TurnReading[];
  leastDeg: number | null;
  greatestDeg: number | null;
  marginDeg: string;
  keepRestOut: boolean;
}

const atFirst: FirstMoveDraft = {
  step: 'direction',
  nudgeSteps: '8',
  intoKeepOut: false,
  direction: null,
  method: 'mark',
  mark: null,
  turnedDeg: '',
  uDeg: '',
  edgeDeg: '360',
  edgeUDeg: '0.014',
  readings: [],
  leastDeg: null,
  greatestDeg: null,
  marginDeg: String(usualMarginDeg),
  keepRestOut: true,
};

export interface FirstMove {
  draft: FirstMoveDraft;
  set: (change: Partial<FirstMoveDraft>) => void;
}

export function useFirstMove(): FirstMove {
  const [draft, setDraft] = useState(atFirst);
  return { draft, set: (change) => setDraft((before) => ({ ...before, ...change })) };
}

/** Microsteps turned since the mark; null without one, or when the count was lost since. */
export function stepsSinceMark({ mark }: Pick<FirstMoveDraft, 'mark'>, count: GuidedView['count'] | null): number | null {
  return mark === null || count === null || mark.number !== count.number ? null : count.steps - mark.steps;
}

/** What was typed as the angle of a turn of so many microsteps, or what is wrong with it. An angle is typed without its sign. */
export function readTurn(
  steps: number | null,
  typed: { deg: string; uDeg: string },
): { reading: TurnReading } | { field: 'steps' | 'turnedDeg' | 'uDeg'; message: string } {
  if (steps === null) return { field: 'steps', message: 'There is no turn yet.' };
  const turned = readDecimal(typed.deg);
  const reading = {
    steps,
    turnedDeg: turned === null ? Number.NaN : Math.abs(turned) * (Math.sign(steps) || 1),
    uDeg: readDecimal(typed.uDeg) ?? Number.NaN,
  };
  return turnProblem(reading) ?? { reading };
}

export const resultOf = ({ readings }: Pick<FirstMoveDraft, 'readings'>): StepsPerDegree | null =>
  readings.length === 0 ? null : stepsPerDegreeOf(readings);

/** The travel once both ends are taught; null before. */
export function taughtOf({ leastDeg, greatestDeg, marginDeg }: FirstMoveDraft): TaughtTravel | null {
  return leastDeg === null || greatestDeg === null ? null : { leastDeg, greatestDeg, marginDeg: readDecimal(marginDeg) ?? Number.NaN };
}
