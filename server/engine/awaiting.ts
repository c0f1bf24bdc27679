import type { PlannedItem } from '@/shared/protocol/cursor';
import type { PromptStep, Step } from '@/shared/protocol/document';
import { waitOf, type Otherwise } from '@/shared/protocol/wait';
import type { Instant } from '../interfaces/clock';
import type { Draft } from './draft';
import type { ActiveStep, Waiting } from './run-context';
import { armRefusal } from './arm-refusal';
import { newRow, stationOf } from './rows';
import { LOOK_MS } from './timing';

/** Steps whose end nobody can plan: until it is calm, until a channel is quiet, until a person has confirmed. */

/** Opens the row of such a step at the present moment. */
export function beginAwaiting(draft: Draft, item: PlannedItem): void {
  const { context } = draft;
  const { moment } = context;
  const waiting = waitingFor(item.step, moment.utcMs);
  const row = newRow(draft, { item, station: stationOf(draft), endUtcMs: waiting.givesUpUtcMs });
  draft.openStep({ item, row, plannedMs: null, motion: null, broken: false, awaits: true });
  context.waiting = waiting;
  context.next = 'awaiting';
  if (item.step.kind === 'prompt') beginPrompt(draft, item.step);
  else context.deadlineUtcMs = Math.min(waiting.firstLookUtcMs, waiting.givesUpUtcMs ?? Infinity);
}

/** A simulated run has nobody: its prompts are confirmed at once. */
function beginPrompt(draft: Draft, step: PromptStep): void {
  const { context, start } = draft;
  draft.log('prompt-asked', { seq: draft.step.row.seq, text: step.text }, context.moment);
  if (start.simulated !== null) {
    context.deadlineUtcMs = context.moment.utcMs;
    return;
  }
  draft.voidArm('a prompt lets people in');
  draft.notify('prompted', step.text);
  context.deadlineUtcMs = context.waiting?.givesUpUtcMs ?? null;
}

function waitingFor(step: Step, sinceUtcMs: number): Waiting {
  const wait = waitOf(step);
  if (wait !== null)
    return {
      sinceUtcMs,
      firstLookUtcMs: sinceUtcMs + 1000 * wait.windowS,
      givesUpUtcMs: sinceUtcMs + 1000 * wait.atMostS,
      otherwise: wait.otherwise,
      found: null,
    };
  const { atMost_s: atMostS, otherwise = 'hold' } = step as PromptStep;
  const givesUpUtcMs = atMostS === undefined ? null : sinceUtcMs + 1000 * atMostS;
  return { sinceUtcMs, firstLookUtcMs: sinceUtcMs, givesUpUtcMs, otherwise, found: null };
}

export const isPrompt = ({ context }: Draft): boolean => context.step?.row.kind === 'prompt';

/** Asks for the samples; the answer comes as `looked`, and if it never does the next deadline asks again. */
export function lookForEnd(draft: Draft): void {
  const { context } = draft;
  const { item, row } = draft.step;
  draft.look({ kind: 'wait', seq: row.seq, step: item.step, fromUtcMs: row.startUtcMs, angleDeg: context.moment.angleDeg });
  context.deadlineUtcMs = Math.min(draft.nowUtcMs + LOOK_MS, context.waiting?.givesUpUtcMs ?? Infinity);
}

/** The answer is about the present step. */
function foundNow(draft: Draft): { met: boolean } | null {
  const { finding } = draft.told('looked');
  if (finding?.kind !== 'wait' || finding.seq !== draft.context.step?.row.seq) return null;
  return finding.found;
}

export const isMet = (draft: Draft): boolean => foundNow(draft)?.met === true;

export function noteLook(draft: Draft): void {
  const { finding } = draft.told('looked');
  const { waiting } = draft.context;
  if (finding?.kind !== 'wait' || waiting === null || foundNow(draft) === null) return;
  waiting.found = finding.found;
}

export const givesUp = (draft: Draft): boolean => {
  const { waiting } = draft.context;
  return waiting?.givesUpUtcMs != null && draft.nowUtcMs >= waiting.givesUpUtcMs - 0.5;
};

export const policyOfWait = (draft: Draft): Otherwise => draft.context.waiting?.otherwise ?? 'hold';

export function endMet(draft: Draft): void {
  const { finding } = draft.told('looked');
  const { seq, path } = draft.step.row;
  if (finding?.kind === 'wait' && finding.unsimulated) draft.log('condition-not-simulated', { seq, path }, draft.event.at);
  else if (finding?.kind === 'wait') draft.log('condition-met', { seq, path, readings: finding.found.readings }, draft.event.at);
  close(draft, draft.event.at);
}

/** The limit of the step is over: what becomes of the run is the step's own policy. */
export function endGivenUp(draft: Draft): void {
  const { seq, path, kind } = draft.step.row;
  const { waiting } = draft.context;
  const otherwise = policyOfWait(draft);
  const at: Instant = { utcMs: waiting?.givesUpUtcMs ?? draft.nowUtcMs, uS: draft.event.at.uS };
  const readings = waiting?.found?.readings ?? [];
  draft.log('condition-not-met', { seq, path, otherwise, samples: waiting?.found?.samples ?? null, readings }, at);
  const minutes = Math.round((at.utcMs - draft.step.row.startUtcMs) / 60_000);
  const what =
    kind === 'prompt'
      ? 'Nobody confirmed the prompt'
      : kind === 'settle'
        ? 'The pendulum did not become calm'
        : 'The channel did not become quiet';
  const after = otherwise === 'hold' && kind !== 'prompt' ? ' Resuming goes on with the next step.' : '';
  if (otherwise !== 'continue') draft.because('condition-not-met', `Step ${path}: ${what} within ${minutes} min.${after}`);
  // A prompt is never passed over: resuming asks again.
  if (kind === 'prompt') {
    draft.closeRow({ at, angleDeg: draft.step.row.angleStartDeg, outcome: 'cut short' });
    draft.context.waiting = null;
  } else close(draft, at);
}

/** Why a prompt cannot be confirmed now; null where it can. */
export function confirmRefusal(draft: Draft): string | null {
  const { context, start } = draft;
  if (!isPrompt(draft)) return 'There is no prompt to be confirmed.';
  const { arm } = draft.told('confirm-prompt');
  const known = context.controller;
  if (!context.linkUp || known === null) return 'The link to the controller is down; wait until it is ready.';
  if (!known.interlockClosed) return 'The interlock is open: close the door first.';
  if (!known.supplyPresent) return 'The motor supply is off: switch it on at the rig.';
  if (start.simulated === null && arm === null)
    return 'The prompt let people in, so the rig is disarmed. Arm it again at the rig, then confirm.';
  return armRefusal(draft, start.simulated === null ? arm : 'simulated', null);
}

export function confirmPrompt(draft: Draft): void {
  const { by, arm } = draft.told('confirm-prompt');
  const { context } = draft;
  const { seq, path } = draft.step.row;
  draft.log('prompt-confirmed', { seq, path, by, arm }, draft.event.at);
  Object.assign(context, { arm, armVoid: null });
  close(draft, draft.event.at);
}

export function refuseConfirm(draft: Draft): void {
  draft.log('confirm-prompt-refused', { by: draft.told('confirm-prompt').by, why: confirmRefusal(draft) });
}

/** Nobody is there in a simulated run. */
export function confirmByItself(draft: Draft): void {
  const { seq, path } = draft.step.row;
  draft.log('prompt-confirmed', { seq, path, by: 'rehearsal' }, draft.context.moment);
  close(draft, draft.context.moment);
}

/** While people are in, the door may be opened: nothing can move, for the rig is disarmed. */
export function noteDoor(draft: Draft): void {
  const { closed } = draft.told('link.interlock').link;
  const { controller } = draft.context;
  if (controller !== null) Object.assign(controller, { interlockClosed: closed, warningDue: closed ? controller.warningDue : true });
  draft.log('interlock', { closed, prompt: true });
}

function close(draft: Draft, at: Instant): void {
  const { context } = draft;
  const { row } = draft.step;
  draft.closeRow({ at, angleDeg: row.angleStartDeg, outcome: 'done' });
  draft.standAt(at, context.moment.angleDeg);
  Object.assign(context, { waiting: null, step: null, onCadence: false, swingStartUtcMs: null, swungFromDeg: null });
}

export const awaits = (step: ActiveStep | null): boolean => step?.awaits === true;
