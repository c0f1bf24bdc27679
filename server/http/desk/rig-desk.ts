import type { IdempotencyAnswer } from '@/server/interfaces/idempotency';
import type { Addressee, RigPlace, RigQuestion } from '@/server/interfaces/process-post';
import { ProblemError } from '../problem-error';

/** Of which rig a question is; `any`: of none, but only a process that drives rigs can answer; null: whoever was asked answers. */
export type WhichRig = RigPlace | 'any' | null;

export interface AskedOfRig {
  question: RigQuestion;
  /** Looked up only where the rig may be another process's. */
  which(): Promise<WhichRig>;
  /** It does no harm when it is heard late or twice, and must not wait. */
  urgent: boolean;
  /** Read only: where no process drives the rig, whoever was asked tells what the database knows. */
  elseStored: boolean;
}

/**
 * Where the routes ask what only the process can answer that drives a rig. Two implementations, in this process and across processes, behave
 * alike (`tests/contract/desk.test.ts`).
 */
export interface RigDesk {
  /** @throws ProblemError as the route itself does, or `rigs-away` where no process answered */
  ask(asked: AskedOfRig): Promise<IdempotencyAnswer>;
  /** Asks every process that drives rigs of a lab for its part of a list whose items are rigs. */
  askEach(question: RigQuestion, labId: string): Promise<IdempotencyAnswer>;
}

/** So long an answer is waited for, ms: the dead man's time of the controller, too. */
export const longestSilenceMs = 2_000;

/** Nobody who drives rigs answered; `left` says what became of the question. */
export function rigsAway(left: string): ProblemError {
  return new ProblemError(
    'rigs-away',
    `No process that drives this rig answers within 2 s. ${left} Use the switch at the rig if anything moves. Whoever keeps the server starts a process with the role rig, or looks into the log of the one that runs.`,
  );
}

export const nothingDone = 'Nothing was set in motion.';
export const maybeDone = 'What was asked for may have been done all the same: look at the rig before you ask again.';

export const addressOf = (which: RigPlace | 'any'): Addressee => (which === 'any' ? 'any' : { rigId: which.rigId });
