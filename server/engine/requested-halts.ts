import type { Draft } from './draft';
import { beginHold, beginStop } from './halting';
import { standingEndUtcMs } from './steps';

/** Holds and stops as people ask for them: logged with the name before anything else, a repeat of a request once. */

const KEYS_KEPT = 16;

/** Whether this request has not been acted on before, as the run knows it; from now on it has. */
function isFirst({ context }: Draft, key: string | null = null): boolean {
  if (key === null) return true;
  const { actedOn = [] } = context;
  if (actedOn.includes(key)) return false;
  context.actedOn = [...actedOn, key].slice(-KEYS_KEPT);
  return true;
}

/** A person's hold: logged with the name before anything else. */
export function requestHold(draft: Draft): void {
  const { by, key } = draft.told('hold');
  if (isFirst(draft, key)) {
    draft.log('hold-requested', { by });
    draft.because('held-by-person', `${by} asked to hold.`);
    draft.context.intervention = { kind: 'hold', by, serverAtUtcMs: draft.nowUtcMs, confirmedAtUtcMs: null, commandId: null };
  }
  beginHold(draft);
}

export function requestStop(draft: Draft): void {
  const { by, key } = draft.told('stop');
  if (isFirst(draft, key)) {
    draft.log('stop-requested', { by });
    draft.because('stopped-by-person', `${by} stopped the run.`);
    draft.context.intervention = { kind: 'stop', by, serverAtUtcMs: draft.nowUtcMs, confirmedAtUtcMs: null, commandId: null };
  }
  beginStop(draft);
}

/** `Hold after this dwell`: a move that already waits in the controller is cancelled, the dwell goes on to its end. */
export function requestHoldAfterDwell(draft: Draft): void {
  const { by, key } = draft.told('hold-after-dwell');
  const { context } = draft;
  if (!isFirst(draft, key)) return;
  draft.log('hold-after-dwell-requested', { by });
  context.holdAfterStep = by;
  context.intervention = { kind: 'hold-after-dwell', by, serverAtUtcMs: draft.nowUtcMs, confirmedAtUtcMs: null, commandId: null };
  // Between the moves of a shaped swing or a kick the step goes on.
  if (context.ahead === null || context.ahead.cancelled || context.step === null || context.step.pause === true) return;
  context.intervention.commandId = draft.command((id) => ({ kind: 'hold', id }));
  context.ahead.cancelled = true;
  context.deadlineUtcMs = standingEndUtcMs(context.step);
}

/** The run goes on past the end of the step after all; what is under way is not touched. */
export function withdrawHold(draft: Draft): void {
  const { by } = draft.told('withdraw-hold');
  const { context } = draft;
  draft.log('hold-after-dwell-withdrawn', { by, askedBy: context.holdAfterStep });
  context.holdAfterStep = null;
  context.intervention = { kind: 'hold-withdrawn', by, serverAtUtcMs: draft.nowUtcMs, confirmedAtUtcMs: draft.nowUtcMs, commandId: null };
}

export const noteRefusedWithdrawal = (draft: Draft): void =>
  draft.log('withdraw-hold-refused', {
    by: draft.told('withdraw-hold').by,
    why: 'No hold is waiting for the end of a step any more. Look at the run again.',
  });
