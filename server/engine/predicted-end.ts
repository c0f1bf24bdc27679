import type { RunStart } from '@/shared/archive/run-records';
import { advanceCursor, type PlannedItem } from '@/shared/protocol/cursor';
import { stateAfterIfPossible } from '@/shared/protocol/step-effect';
import { moveOf } from '@/shared/protocol/step-parts';
import { waitOf } from '@/shared/protocol/wait';
import type { ActiveStep, RunContext } from './run-context';

export interface PredictionInput {
  nowUtcMs: number;
  /** Told of each step to come and when it would begin. */
  eachStep?: (item: PlannedItem, startUtcMs: number) => void;
}

/** When the run would finish if it went on from here without another hitch, UTC ms. */
export function predictEndUtcMs(start: RunStart, context: RunContext, { nowUtcMs, eachStep }: PredictionInput): number {
  let { cursor } = context;
  let state = afterPresentStep(start, context, nowUtcMs);
  for (;;) {
    const next = advanceIfPossible(start, cursor, state);
    if (next === null || next.item === null) return state.utcMs;
    cursor = next.cursor;
    eachStep?.(next.item, state.utcMs);
    state = stateAfterIfPossible(next.item, start, state);
  }
}

/** Null for a protocol that goes on for ever: the run will say so when it gets there. */
function advanceIfPossible(...args: Parameters<typeof advanceCursor>): ReturnType<typeof advanceCursor> | null {
  try {
    return advanceCursor(...args);
  } catch (error) {
    if (error instanceof RangeError) return null;
    throw error;
  }
}

/** What a step that a hold left unfinished still takes, ms: of a move only the rest. */
function lengthLeftMs({ rig }: RunStart, { item, motion, plannedMs, row }: ActiveStep, angleDeg: number | null): number {
  if (motion?.targetDeg != null && angleDeg !== null) return 1000 * moveOf(item, rig, angleDeg).durationS;
  return plannedMs ?? (row.plannedEndUtcMs ?? row.startUtcMs) - row.plannedStartUtcMs;
}

function afterPresentStep(start: RunStart, context: RunContext, nowUtcMs: number) {
  const { step, moment, swingStartUtcMs, waiting } = context;
  // What ends by a condition may be met as soon as its samples are there.
  if (step?.awaits === true) {
    const windowMs = 1000 * (waitOf(step.item.step)?.windowS ?? 0);
    const utcMs = Math.max(nowUtcMs, step.broken ? nowUtcMs + windowMs : (waiting?.firstLookUtcMs ?? nowUtcMs));
    return { utcMs, angleDeg: moment.angleDeg, swingStartUtcMs: null };
  }
  if (step?.broken === true && step.row.kind === 'wait')
    return stateAfterIfPossible(step.item, start, { utcMs: nowUtcMs, angleDeg: moment.angleDeg, swingStartUtcMs: null });
  if (step === null) return { utcMs: Math.max(moment.utcMs, nowUtcMs), angleDeg: moment.angleDeg, swingStartUtcMs: null };
  const { row, motion, broken, plannedMs } = step;
  if (step.pause === true)
    return { utcMs: Math.max(nowUtcMs, row.plannedEndUtcMs ?? nowUtcMs), angleDeg: moment.angleDeg, swingStartUtcMs };
  const lengthMs = plannedMs ?? (row.plannedEndUtcMs ?? row.startUtcMs) - row.plannedStartUtcMs;
  const offsetMs = step.item.part?.kind === 'move' ? 1000 * step.item.part.offsetS : 0;
  const endUtcMs = broken
    ? nowUtcMs + lengthLeftMs(start, step, context.controller?.angleDeg ?? null)
    : Math.max(row.startUtcMs + lengthMs, nowUtcMs);
  return {
    utcMs: endUtcMs,
    angleDeg: motion?.targetDeg ?? moment.angleDeg,
    swingStartUtcMs: motion === null || row.kind === 'rotate' ? null : broken ? nowUtcMs - offsetMs : (swingStartUtcMs ?? row.startUtcMs),
  };
}
