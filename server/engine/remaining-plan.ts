import type { RunStart } from '@/shared/archive/run-records';
import { uIsPlanned } from '@/shared/planning/planned-method';
import { cadenceOf } from '@/shared/planning/strategies';
import { predictU } from '@/shared/planning/plan-uncertainty';
import type { LeafStep, PlannedItem } from '@/shared/protocol/cursor';
import { planTimeline } from '@/shared/protocol/timeline';
import { mateOf } from './pairs';
import { predictEndUtcMs } from './predicted-end';
import type { RunContext, RunSnapshot } from './run-context';

/** What is left of a run, for those who are about to let it go on. */
export interface RemainingPlan {
  /** Dwells still to come, one that is begun anew included. */
  dwellsLeft: number;
  finishUtcMs: number;
  /** The step that begins first; null: the run is at its end. */
  next: { path: string; kind: string; label: string; station: string } | null;
  /** The first motion, with where it comes from: a step of the protocol; null: nothing moves any more. */
  firstMotion: LeafStep | null;
  /** It is the way back of a rotation, whose way out is over. */
  turnsBack: boolean;
  /** Relative standard uncertainty of G by the plan (not measured): after the dwells done, and after those still to come. */
  relativeU: { soFar: number | null; atEnd: number | null };
}

/** What is left if a held run is resumed now; null while it is not held. */
export function resumePlan(start: RunStart, { state, context }: RunSnapshot, nowUtcMs: number): RemainingPlan | null {
  if (state !== 'held') return null;
  const { step } = context;
  const anew = step?.broken === true ? step : null;
  return planFrom(start, context, {
    nowUtcMs,
    dwells: anew?.row.kind === 'dwell' ? 1 : 0,
    next: anew === null ? null : nextOf(anew.item, anew.row.station),
    firstMotion: anew?.motion == null ? null : anew.item.step,
    turnsBack: anew !== null && isWayBack(anew.item),
  });
}

export interface SkipPlan extends RemainingPlan {
  /** The row of the step that would be left out. */
  seq: number;
  path: string;
  kind: string;
  label: string;
  station: string;
  /** How much of it would be left out, s. */
  leftS: number;
  /** The dwell, done already, that would be left without its pair; null: none. */
  notGoodPath: string | null;
}

/** What a skip would leave out and what would be left after it; null where no step stands. */
export function skipPlan(start: RunStart, { state, context }: RunSnapshot, nowUtcMs: number): SkipPlan | null {
  const { step } = context;
  if ((state !== 'held' && state !== 'standing' && state !== 'awaiting') || step === null || step.motion !== null) return null;
  if (step.pause === true || (step.row.outcome !== null && !step.broken)) return null;
  const { seq, path, kind, label, station, plannedEndUtcMs } = step.row;
  const leftMs = step.broken ? (step.plannedMs ?? 0) : (plannedEndUtcMs ?? nowUtcMs) - nowUtcMs;
  const after = { ...context, step: null, moment: { ...context.moment, utcMs: nowUtcMs } };
  return {
    ...planFrom(start, after, { nowUtcMs, dwells: 0, next: null, firstMotion: null, turnsBack: false }),
    ...{ seq, path, kind, label, station },
    leftS: Math.max(0, leftMs / 1000),
    notGoodPath: mateOf(context, step.row)?.path ?? null,
  };
}

interface Begun {
  nowUtcMs: number;
  /** Dwells that the present step adds to those to come. */
  dwells: number;
  next: RemainingPlan['next'];
  firstMotion: LeafStep | null;
  turnsBack: boolean;
}

const motions = new Set<LeafStep['kind']>(['home', 'swing', 'kick', 'rotate']);
const isWayBack = ({ step, part }: PlannedItem): boolean => step.kind === 'rotate' && part?.kind === 'move' && part.name === 'b';

const nextOf = ({ path, step }: PlannedItem, station: string) => ({ path, kind: step.kind, label: step.label ?? '', station });

function planFrom(start: RunStart, context: RunContext, begun: Begun): RemainingPlan {
  let { dwells, next, firstMotion, turnsBack } = begun;
  const finishUtcMs = predictEndUtcMs(start, context, {
    nowUtcMs: begun.nowUtcMs,
    eachStep: (item) => {
      const { step } = item;
      next ??= nextOf(item, '');
      if (step.kind === 'dwell') dwells += 1;
      if (motions.has(step.kind) && firstMotion === null) [firstMotion, turnsBack] = [step, isWayBack(item)];
    },
  });
  return {
    dwellsLeft: dwells,
    finishUtcMs,
    next,
    firstMotion,
    turnsBack,
    relativeU: expectedU(start, context.dwellsDone, context.dwellsDone + dwells),
  };
}

/** The whole plan's cadence with so many dwells; null where its protocol registered a method whose u is not planned, before there is a reversal, or where the rig does not tell. */
function expectedU(start: RunStart, done: number, inAll: number): RemainingPlan['relativeU'] {
  const timeline = planTimeline(start, { utcMs: 0, angleDeg: start.rig.motion?.homeDeg ?? 0 });
  const cadence = uIsPlanned(start.protocol) ? cadenceOf(timeline, start.rig) : null;
  const after = (dwells: number) =>
    cadence === null || dwells < 2 ? null : (predictU(start.rig, { ...cadence, dwells })?.relativeU ?? null);
  return { soFar: after(done), atEnd: after(inAll) };
}
