import type { Instant } from '../interfaces/clock';
import { startRun } from './beginning';
import { armRefusal, type ArmGiven } from './arm-refusal';
import type { Draft } from './draft';
import type { ActiveStep, InterruptionCause, KnownController, RunEvent } from './run-context';
import { finishMotion, reachedTarget, takeAhead, untoldEdge } from './motions';
import { finishedWords, heedFinishing } from './finishing';
import { slipRefusal } from './position';
import { awaits, beginAwaiting } from './awaiting';
import { toleranceDeg } from './rows';
import { lostWords, noteWound } from './windings';
import { beginHome, beginStanding, beginSwing, chooseAfter, chooseNext, firstLeadMs, standingEndUtcMs } from './steps';
import { CONFIRM_MS, GAP_LIMIT_MS, LEAST_LEAD_MS } from './timing';

/** How a run comes to rest and how it goes on: holds, stops, interruptions, resuming. */

/** Events after which a run never goes on without a person, and what they mean for people. */
const grave = {
  'controller-reset':
    'The controller restarted and has lost its position. Somebody has to be at the rig: home it and arm it again in a new run.',
  interlock: 'The interlock was opened. Close it and arm the rig again on site, then resume.',
  supply: 'The motor supply was lost, and with it the position. Somebody has to be at the rig: home it and arm it again in a new run.',
  limit: 'A motion met a travel limit. Somebody has to look at the rig before it moves again.',
} as const;
export type GraveCause = keyof typeof grave;

const interruptions: Record<InterruptionCause, string> = {
  'link-lost': 'The link to the controller was lost.',
  'server-restarted': 'The server restarted.',
  'lease-lapsed': 'The controller had no renewal of the motion lease for 2 s and ended the motion.',
  'database-away': 'The database did not answer for more than 4 s.',
};

const iso = (utcMs: number) => new Date(utcMs).toISOString();

/** Ends all motion; the chart waits in `holding` for the controller's word. */
export function beginHold(draft: Draft): void {
  halt(draft, actedHold(draft) ?? draft.command((id) => ({ kind: 'hold', id })));
}

/** Id of the hold that went to the controller before anything was decided; null where none did. */
const actedHold = ({ event }: Draft): string | null => (event.type === 'hold' || event.type === 'database-away' ? event.acted : null);

export function beginStop(draft: Draft): void {
  const acted = draft.event.type === 'stop' ? draft.event.acted : null;
  halt(draft, acted ?? draft.command((id) => ({ kind: 'stop', id, releaseDrivers: draft.start.rig.motion?.safeWhenFree === true })));
}

function halt(draft: Draft, commandId: string): void {
  const { context } = draft;
  context.haltedAtUtcMs ??= draft.nowUtcMs;
  context.deadlineUtcMs = draft.nowUtcMs + CONFIRM_MS;
  if (context.intervention !== null && context.intervention.confirmedAtUtcMs === null) context.intervention.commandId = commandId;
}

/** Takes down what interrupted the run, and why it is held or stopped if the protocol does not let it resume. */
export function noteInterruption(draft: Draft): void {
  const { event, context } = draft;
  const cause = causeOf(event);
  if (cause === null) return;
  const sinceUtcMs =
    event.type === 'server-restarted' ? event.aliveUtcMs : event.type === 'database-away' ? event.sinceUtcMs : draft.stamp.utcMs;
  noteRestart(draft);
  noteDatabaseAway(draft);
  const before = context.interruption;
  context.interruption = { cause, sinceUtcMs: Math.min(before?.sinceUtcMs ?? sinceUtcMs, sinceUtcMs) };
  draft.because(cause, event.type === 'link.refused-controller' ? event.link.why : interruptions[cause]);
}

/** Nothing is set in motion before it is back. */
export function noteDatabaseAway(draft: Draft): void {
  const { event, context } = draft;
  if (event.type !== 'database-away') return;
  context.databaseAwaySinceUtcMs = event.sinceUtcMs;
  draft.log('database-away', { since: iso(event.sinceUtcMs) });
}

export function noteDatabaseBack(draft: Draft): void {
  const { context } = draft;
  const sinceUtcMs = context.databaseAwaySinceUtcMs;
  context.databaseAwaySinceUtcMs = null;
  if (sinceUtcMs !== null) draft.log('database-back', { gapS: (draft.nowUtcMs - sinceUtcMs) / 1000 });
}

/** A process that has just started knows nothing of the line yet, and has found the database. */
export function noteRestart(draft: Draft): void {
  const { event, context } = draft;
  if (event.type !== 'server-restarted') return;
  noteDatabaseBack(draft);
  const by = event.serverName == null ? {} : { takenUpBy: event.serverName };
  draft.log('server-restarted', { gapS: (draft.nowUtcMs - event.aliveUtcMs) / 1000, ...by });
  context.linkUp = false;
  context.linkDownSinceUtcMs ??= event.aliveUtcMs;
}

function causeOf(event: RunEvent): InterruptionCause | null {
  if (event.type === 'link.lost' || event.type === 'link.refused-controller') return 'link-lost';
  if (event.type === 'link.lease-lapsed' || event.type === 'link.motion-ended') return 'lease-lapsed';
  return event.type === 'server-restarted' || event.type === 'database-away' ? event.type : null;
}

/** Under `resume`: waits for the line, then for standstill; a hold makes both sure and cancels what may still wait. */
export function awaitReturn(draft: Draft): void {
  const { context } = draft;
  if (context.linkUp && actedHold(draft) === null) draft.command((id) => ({ kind: 'hold', id }));
  context.deadlineUtcMs = (context.interruption?.sinceUtcMs ?? draft.nowUtcMs) + GAP_LIMIT_MS;
}

/** Why an interrupted run may not go on by itself; null where it may. */
export function returnRefusal(draft: Draft): string | null {
  const { context } = draft;
  const gapMs = draft.nowUtcMs - (context.interruption?.sinceUtcMs ?? draft.nowUtcMs);
  if (gapMs >= GAP_LIMIT_MS) return 'It lasted more than 10 min.';
  return motionRefusal(draft, draft.start.simulated === null ? context.arm : 'simulated', context.armVoid);
}

/** What stands between a run at rest and its next motion, in a sentence; null where nothing does. */
export function motionRefusal(draft: Draft, arm: ArmGiven, armVoid: string | null): string | null {
  const { context } = draft;
  const known = context.controller;
  if (context.databaseAwaySinceUtcMs !== null) return 'The database is away; wait until it answers.';
  if (!context.linkUp || known === null) return 'The link to the controller is down; wait until it is ready.';
  if (!known.interlockClosed) return 'The interlock is open; close it first.';
  if (!known.supplyPresent) return 'The motor supply is off; switch it on at the rig.';
  if (!known.positionKnown && context.step?.row.kind !== 'home')
    return `The controller does not know its position, so this run cannot go on. Stop it, and ${lostWords(draft) ?? 'home the rig in a new run.'}`;
  return slipRefusal(draft) ?? elsewhereRefusal(draft, known) ?? armRefusal(draft, arm, armVoid);
}

function elsewhereRefusal(draft: Draft, known: KnownController): string | null {
  const { step, moment } = draft.context;
  if (step === null || step.motion !== null || known.angleDeg === null) return null;
  if (Math.abs(known.angleDeg - moment.angleDeg) <= toleranceDeg(draft)) return null;
  return `The sources stand at ${known.angleDeg.toFixed(2)} deg, not at ${moment.angleDeg.toFixed(2)} deg where this step measures. Stop this run and start a new one.`;
}

/** The protocol lets the interrupted run go on: what was standing goes on standing, a broken move is finished first. */
export function carryOn(draft: Draft): void {
  const { context } = draft;
  const { interruption, step } = context;
  draft.log('resumed', {
    by: 'protocol',
    cause: interruption?.cause ?? null,
    gapS: (draft.nowUtcMs - (interruption?.sinceUtcMs ?? draft.nowUtcMs)) / 1000,
  });
  context.interruption = null;
  context.reason = null;
  context.ahead = null;
  if (step === null) return resumeStep(draft);
  if (awaits(step)) {
    context.deadlineUtcMs = draft.nowUtcMs;
    context.next = 'awaiting';
    return;
  }
  if (step.motion === null) {
    context.deadlineUtcMs = Math.max(draft.nowUtcMs, standingEndUtcMs(step) - firstLeadMs(step.row.kind));
    context.next = 'standing';
    return;
  }
  closeForRest(draft);
  if (context.step === null) return chooseNext(draft);
  resumeStep(draft);
}

/** Why a person's resume is refused; null where it may go on. */
export function resumeRefusal(draft: Draft): string | null {
  return motionRefusal(draft, draft.start.simulated === null ? draft.told('resume').arm : 'simulated', null);
}

export function noteRefusedResume(draft: Draft): void {
  draft.log('resume-refused', { by: draft.told('resume').by, why: resumeRefusal(draft) });
}

export function resume(draft: Draft): void {
  const { by, arm } = draft.told('resume');
  const { context } = draft;
  Object.assign(context, { arm, armVoid: null, holdAfterStep: null, interruption: null, reason: null, haltedAtUtcMs: null });
  context.intervention = { kind: 'resume', by, serverAtUtcMs: draft.nowUtcMs, confirmedAtUtcMs: null, commandId: null };
  draft.log('resumed', { by, arm });
  draft.notify('resumed', `${by} resumed the run.`);
  resumeStep(draft);
  if (context.next === 'standing') context.intervention.confirmedAtUtcMs = draft.nowUtcMs;
}

/** From rest, here and now: the step left unfinished, or else the next one. The cadence starts anew. */
function resumeStep(draft: Draft): void {
  const { context } = draft;
  const { step } = context;
  draft.standAt(draft.event.at, draft.controller.angleDeg ?? context.moment.angleDeg);
  context.ahead = null;
  context.moveRetries = 0;
  context.swungFromDeg = null;
  if (context.startedAtUtcMs === null) return startRun(draft);
  if (step === null || !step.broken) return chooseNext(draft);
  if (step.row.kind === 'home') return beginHome(draft, step.item);
  if (awaits(step)) return beginAwaiting(draft, step.item);
  if (step.pause === true) return resumePause(draft, step);
  // A dwell or settle lasts as long as first planned; a wait ends at its time of day, however long it was held.
  if (step.motion === null) return beginStanding(draft, step.item, step.row.kind === 'wait' ? null : step.plannedMs);
  beginSwing(draft, { item: step.item, late: true });
}

/** Between two moves: the next one in its time if that is still to come, else at once and late. */
function resumePause(draft: Draft, step: ActiveStep): void {
  const leftMs = standingEndUtcMs(step) - draft.nowUtcMs;
  if (leftMs > LEAST_LEAD_MS) return beginStanding(draft, step.item, leftMs);
  chooseAfter(draft, true);
}

/**
 * A move that waited in the controller may have begun while nobody listened: then the sources no longer stand where the
 * standing step left them, and the beginning is the start time it was sent with.
 */
export function takeAheadUnseen(draft: Draft): void {
  const { ahead, step, moment, controller } = draft.context;
  if (ahead === null || step?.motion !== null || controller?.angleDeg == null || draft.nowUtcMs < ahead.startUtcMs) return;
  if (Math.abs(controller.angleDeg - moment.angleDeg) > toleranceDeg(draft)) takeAhead(draft);
}

/** The turntable stands still: the open row is closed with what is known of its end. */
function closeForRest(draft: Draft): void {
  const { context } = draft;
  takeAheadUnseen(draft);
  const { step } = context;
  if (step === null || step.row.outcome !== null) return;
  const angleDeg = draft.controller.positionKnown ? draft.controller.angleDeg : null;
  if (step.motion === null) return closeStanding(draft, angleDeg);
  step.row.angleEndDeg ??= angleDeg;
  if (reachedTarget(draft)) {
    if (step.row.endUtcMs === null) {
      const fromUtcMs = Math.min(draft.nowUtcMs, step.row.startUtcMs + step.motion.durationMs);
      const { utcMs, uS } = untoldEdge(draft, 'ended', { fromUtcMs, toUtcMs: draft.nowUtcMs });
      Object.assign(step.row, { endUtcMs: utcMs, uEndS: uS });
    }
    finishMotion(draft);
    context.step = null;
    return;
  }
  const at: Instant = { utcMs: step.row.endUtcMs ?? Math.max(draft.stamp.utcMs, step.row.startUtcMs), uS: step.row.uEndS ?? restU(draft) };
  step.row.station = '';
  draft.closeRow({ at, angleDeg: step.row.angleEndDeg, outcome: 'cut short' });
}

function closeStanding(draft: Draft, angleDeg: number | null): void {
  const { context } = draft;
  if (context.step === null) return;
  const endUtcMs = standingEndUtcMs(context.step);
  const haltedAtUtcMs = context.haltedAtUtcMs ?? draft.nowUtcMs;
  const over = haltedAtUtcMs >= endUtcMs && !awaits(context.step);
  context.waiting = null;
  const at: Instant = { utcMs: over ? endUtcMs : haltedAtUtcMs, uS: context.uPlanS };
  draft.closeRow({ at, angleDeg: angleDeg ?? context.step.row.angleStartDeg, outcome: over ? 'done' : 'cut short' });
  if (over) context.step = null;
}

/** A motion whose end nobody saw ended somewhere between its beginning and now: rectangular, s. */
function restU(draft: Draft): number {
  const since = draft.context.step?.row.startUtcMs ?? draft.nowUtcMs;
  return Math.abs(draft.nowUtcMs - since) / 1000 / Math.sqrt(12);
}

/** The controller's own word, or the lack of it, ends the waiting in `holding`. */
export function becomeHeld(draft: Draft): void {
  const { context } = draft;
  confirm(draft);
  closeForRest(draft);
  context.ahead = null;
  heedFinishing(context);
  Object.assign(context, { holdAfterStep: null, haltedAtUtcMs: null, deadlineUtcMs: null, interruption: null });
  noteWound(draft, 'held');
  const { code = 'held', text = '' } = context.reason ?? {};
  draft.log('held', { code, reason: text, confirmed: draft.event.type !== 'deadline' });
  draft.notify('held', text);
}

export function becomeStopped(draft: Draft): void {
  const { context } = draft;
  confirm(draft);
  closeForRest(draft);
  noteWound(draft, 'over');
  end(draft, draft.event.at.utcMs);
  const { code = 'stopped', text = '' } = context.reason ?? {};
  draft.log('stopped', { code, reason: text, confirmed: draft.event.type !== 'deadline' });
  draft.voidArm('the run was stopped');
  draft.notify('stopped', text);
}

function confirm(draft: Draft): void {
  const { intervention } = draft.context;
  if (draft.event.type === 'deadline' || intervention === null) return;
  intervention.confirmedAtUtcMs ??= draft.stamp.utcMs;
}

export function becomeFinished(draft: Draft): void {
  const { context, start } = draft;
  const { moment } = context;
  const asked = start.protocol.atEnd?.drivers === 'release';
  const release = asked && start.rig.motion?.safeWhenFree === true;
  if (release) {
    draft.command((id) => ({ kind: 'stop', id, releaseDrivers: true }));
    draft.voidArm('the drivers were released, so the position is lost');
  }
  end(draft, moment.utcMs);
  const why = asked && !release ? { driversWhy: 'the rig is not marked as safe when free (motion.safeWhenFree)' } : {};
  const early = finishedWords(context, moment.utcMs);
  const before = early === '' ? {} : { early: early.slice(2) };
  draft.log('finished', { dwells: context.dwellsDone, drivers: release ? 'release' : 'keep', ...why, ...before }, moment);
  draft.notify('finished', early === '' ? 'The run finished as planned.' : `The run finished${early}.`);
}

/** Nothing is left moving: a stop goes out with the failure. */
export function becomeFailed(draft: Draft): void {
  const { context } = draft;
  noteWound(draft, 'over');
  const { code = 'failed', text = 'The run failed.' } = context.reason ?? {};
  const { step } = context;
  if (step !== null) draft.closeRow({ at: draft.stamp, angleDeg: context.controller?.angleDeg ?? null, outcome: 'failed' });
  draft.command((id) => ({ kind: 'stop', id, releaseDrivers: false }));
  end(draft, draft.nowUtcMs);
  draft.log('failed', { code, reason: text });
  draft.notify('failed', text);
}

function end(draft: Draft, utcMs: number): void {
  Object.assign(draft.context, { endedAtUtcMs: utcMs, deadlineUtcMs: null, ahead: null, haltedAtUtcMs: null });
}

/** Interlock, supply, reset or limit: the arm is void (but for a limit), and only a person may go on. */
export function noteGrave(draft: Draft, cause: GraveCause): void {
  draft.because(cause, grave[cause]);
  if (cause !== 'limit') draft.voidArm(grave[cause].split('.')[0]?.toLowerCase() ?? cause);
}
