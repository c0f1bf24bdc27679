import { finishEarly, finishRefusal, isFinishing, refuseFinish, refuseWithdrawFinish, withdrawFinish } from './finishing';
import { setup } from 'xstate';
import type { RunStart } from '@/shared/archive/run-records';
import { Draft, type Output } from './draft';
import {
  awaitReturn,
  beginHold,
  beginStop,
  type GraveCause,
  noteDatabaseAway,
  noteDatabaseBack,
  noteGrave,
  noteInterruption,
  returnRefusal,
} from './halting';
import { noteRefusedWithdrawal, requestHold, requestHoldAfterDwell, requestStop, withdrawHold } from './requested-halts';
import {
  hasRestarted,
  noteArmEnded,
  noteArmKey,
  noteClock,
  noteInterlock,
  noteLease,
  noteLost,
  noteReady,
  noteRefusal,
  noteReset,
  noteStandstill,
  noteStranger,
  noteStrangeMotion,
  noteSupply,
  unseenCause,
} from './observations';
import { hasSlipped, noteEdge } from './position';
import { type RunContext, type RunEvent } from './run-context';
import { noteRefusedSkip, skip, skipRefusal } from './skipping';
import { finishMotion, noteBegan, noteEnded, takeAhead } from './motions';
import { chooseNext, standingEndUtcMs } from './steps';

/** What the run's chart is put together from: actions, guards and the transitions that several states share. */

export interface ChartContext {
  start: RunStart;
  run: RunContext;
  out: Output;
}

export interface ChartInput {
  start: RunStart;
  nowUtcMs: number;
}

export type Told = { context: ChartContext; event: RunEvent };
type Writer = (draft: Draft) => void;

export const chart = setup({
  types: { context: {} as ChartContext, events: {} as RunEvent, input: {} as ChartInput },
});

const draftOf = ({ context, event }: Told) => new Draft(context.start, event, { context: context.run, out: context.out });

/** An action: the writers one after another on one working copy. */
export const act = (...writers: Writer[]) =>
  chart.assign((told) => {
    const draft = draftOf(told);
    for (const write of writers) write(draft);
    return { run: draft.context, out: draft.out };
  });

/** A guard that asks `holds` of the context as the writers would leave it. */
export const when =
  (holds: (draft: Draft) => boolean, ...writers: Writer[]) =>
  (told: Told) => {
    const draft = draftOf(told);
    for (const write of writers) write(draft);
    return holds(draft);
  };

const policyIs =
  (policy: 'resume' | 'stop') =>
  ({ context }: Told) =>
    (context.start.protocol.onInterruption ?? 'hold') === policy;

/** Only a person may go on after this: held, or stopped where the protocol says so. */
export const gravely = (...writers: Writer[]) => [
  { guard: policyIs('stop'), target: 'stopping' as const, actions: act(...writers, beginStop) },
  { target: 'holding' as const, actions: act(...writers, beginHold) },
];

/** What the protocol's `onInterruption` decides. */
const interruptedBy = (...writers: Writer[]) => [
  { guard: policyIs('stop'), target: 'stopping' as const, actions: act(...writers, noteInterruption, beginStop) },
  { guard: policyIs('resume'), target: 'interrupted' as const, actions: act(...writers, noteInterruption, awaitReturn) },
  { target: 'holding' as const, actions: act(...writers, noteInterruption, beginHold) },
];

export const guarded = <T extends object>(guard: (told: Told) => boolean, transitions: T[]) =>
  transitions.map((entry) => ({
    ...entry,
    guard: 'guard' in entry ? (told: Told) => guard(told) && (entry.guard as (told: Told) => boolean)(told) : guard,
  }));

export const fails = (code: string, text: string) => ({
  target: 'failed' as const,
  actions: act((draft) => void draft.because(code, text)),
});

/** What became of a motion is not known, as on a line that loses most answers: it is brought to rest, and a person may resume. */
export const holdsFor = (code: string, text: string) => ({
  target: 'holding' as const,
  actions: act((draft) => void draft.because(code, text), beginHold),
});

export const isMine = ({ context, event }: Told) =>
  'link' in event && 'commandId' in event.link && event.link.commandId === context.run.step?.motion?.commandId;
export const isAhead = ({ context, event }: Told) =>
  'link' in event && 'commandId' in event.link && event.link.commandId === context.run.ahead?.commandId;
export const endedAhead = (told: Told) => isAhead(told) && told.event.type === 'link.motion-ended' && told.event.link.cause === 'done';
export const isCancelled = ({ context }: Told) => context.run.ahead?.cancelled === true;
export const bootedAnew = ({ context, event }: Told) =>
  event.type === 'link.ready' && hasRestarted(context.run, event.link.controller.bootId);
const disturbedUnseen = ({ context, event }: Told) =>
  event.type === 'link.ready' && unseenCause(context.run, event.link.controller) !== null;
const isOpenOrAbsent = ({ event }: Told) =>
  (event.type === 'link.interlock' && !event.link.closed) || (event.type === 'link.supply' && !event.link.present);
const endedBy =
  (...causes: string[]) =>
  (told: Told) =>
    isMine(told) && told.event.type === 'link.motion-ended' && causes.includes(told.event.link.cause);
const refusedFor =
  (isFor: (told: Told) => boolean, ...codes: string[]) =>
  (told: Told) =>
    isFor(told) && told.event.type === 'link.refused' && codes.includes(told.event.link.code);
const graveOf = (cause: GraveCause) => (draft: Draft) => noteGrave(draft, cause);

/** Refusals that are over a moment later; all others say that the command is wrong or the controller is not fit. */
const passing = [
  'past',
  'far',
  'warning',
  'lease',
  'session',
  'stopped',
  'busy',
  'old',
  'repeat',
  'reused',
  'not-renewed',
  'no-session',
  'overtaken',
];
const MOST_RETRIES = 3;

const explainRefusal: Writer = (draft) => {
  if (draft.event.type === 'link.refused')
    draft.because('command-refused', `The controller refused the motion: ${draft.event.link.message}`);
};
export const explainHomeFailure: Writer = (draft) => {
  if (draft.event.type === 'link.home-failed') draft.because('home-failed', `Homing gave up: ${draft.event.link.message}`);
};
export const explainController: Writer = (draft) =>
  void draft.because('controller-refused', draft.told('link.refused-controller').link.why);
const explainStranger: Writer = (draft) =>
  void draft.because('stopped-at-rig', 'The motion was ended at the rig, not by this run. Find out why, then resume.');
export const explainNoReturn: Writer = (draft) => {
  const why = returnRefusal(draft);
  if (why !== null) draft.because(draft.context.interruption?.cause ?? 'held', `${draft.context.reason?.text ?? ''} ${why}`.trim());
};

/** A refused motion: the interlock or supply is an incident, a passing refusal is tried again and in the end held, any other fails the run. */
export const refusals = (isFor: (told: Told) => boolean, again: Writer) => [
  ...guarded(refusedFor(isFor, 'interlock'), gravely(noteRefusal, graveOf('interlock'))),
  ...guarded(refusedFor(isFor, 'supply'), gravely(noteRefusal, graveOf('supply'))),
  {
    guard: (told: Told) => refusedFor(isFor, ...passing)(told) && told.context.run.moveRetries < MOST_RETRIES,
    actions: act(noteRefusal, again),
  },
  { guard: refusedFor(isFor, ...passing), target: 'holding' as const, actions: act(noteRefusal, explainRefusal, beginHold) },
  { guard: isFor, target: 'failed' as const, actions: act(noteRefusal, explainRefusal) },
  { actions: act(noteRefusal) },
];

/** What the controller tells in every state, and what is only written down. */
export const heard = {
  'link.arm-key': { actions: act(noteArmKey) },
  'link.clock-stepped': { actions: act(noteClock) },
  'link.edge': { actions: act(noteEdge) },
  'link.standstill': { actions: act(noteStandstill) },
  'link.lease-lapsed': { actions: act(noteLease) },
  'link.refused': { actions: act(noteRefusal) },
};

/** A controller that restarted, or lost interlock or supply, while nobody listened. */
export const returns = [...guarded(bootedAnew, gravely(noteReset, noteReady)), ...guarded(disturbedUnseen, gravely(noteReady))];

/** The end of the run, before that of its protocol or not. */
export const finishes = {
  'finish-early': [{ guard: when((draft) => finishRefusal(draft) === null), actions: act(finishEarly) }, { actions: act(refuseFinish) }],
  'withdraw-finish': [
    { guard: ({ context }: Told) => isFinishing(context.run), actions: act(withdrawFinish) },
    { actions: act(refuseWithdrawFinish) },
  ],
};

/** What ends or changes a run that is under way, whatever step it is in. */
export const underWay = {
  ...heard,
  ...finishes,
  'link.edge': [
    { guard: when(hasSlipped, noteEdge), target: 'holding' as const, actions: act(noteEdge, beginHold) },
    { actions: act(noteEdge) },
  ],
  hold: { target: 'holding' as const, actions: act(requestHold) },
  stop: { target: 'stopping' as const, actions: act(requestStop) },
  'hold-after-dwell': { actions: act(requestHoldAfterDwell) },
  'withdraw-hold': [
    { guard: ({ context }: Told) => context.run.holdAfterStep !== null, actions: act(withdrawHold) },
    { actions: act(noteRefusedWithdrawal) },
  ],
  resume: { actions: act((draft) => draft.log('resume-refused', { why: 'the run is not held' })) },
  skip: { actions: act(noteRefusedSkip) },
  'link.lost': interruptedBy(noteLost),
  'arm-ended': { target: 'holding' as const, actions: act(noteArmEnded, beginHold) },
  'link.ready': [...returns, { actions: act(noteReady) }],
  'link.reset': gravely(noteReset),
  'link.interlock': [...guarded(isOpenOrAbsent, gravely(noteInterlock)), { actions: act(noteInterlock) }],
  'link.supply': [...guarded(isOpenOrAbsent, gravely(noteSupply)), { actions: act(noteSupply) }],
  'link.refused-controller': interruptedBy(noteStranger),
  'server-restarted': interruptedBy(),
  'database-away': interruptedBy(),
  'database-back': { actions: act(noteDatabaseBack) },
};

/** The rest of a step that stands, left out by a person. */
export const skips = [
  { guard: when((draft) => skipRefusal(draft) === null), target: 'choosing' as const, actions: act(skip) },
  { actions: act(noteRefusedSkip) },
];

/** Asked for too late: nothing waits for the end of a step any more, and nothing is under way. */
export const refusedAtRest = {
  'withdraw-hold': { actions: act(noteRefusedWithdrawal) },
  'finish-early': { actions: act(refuseFinish) },
  'withdraw-finish': { actions: act(refuseWithdrawFinish) },
  skip: { actions: act(noteRefusedSkip) },
};

/** At rest already: what is written down of the database decides nothing but whether a resume is possible. */
const databaseNoted = {
  'database-away': { actions: act(noteDatabaseAway) },
  'database-back': { actions: act(noteDatabaseBack) },
};

/** How the motion of the present step may end. */
export const motionEnds = [
  { guard: endedBy('done'), target: 'choosing' as const, actions: act(noteEnded, finishMotion, chooseNext) },
  ...guarded(endedBy('lease'), interruptedBy(noteEnded)),
  ...guarded(endedBy('limit'), gravely(noteEnded, graveOf('limit'))),
  ...guarded(endedBy('interlock'), gravely(noteEnded, graveOf('interlock'))),
  ...guarded(endedBy('supply'), gravely(noteEnded, graveOf('supply'))),
  ...guarded(endedBy('reset'), gravely(noteEnded, graveOf('controller-reset'))),
  { guard: isMine, target: 'holding' as const, actions: act(noteEnded, explainStranger, beginHold) },
];

export const strangeMotion = {
  guard: (told: Told) => !isMine(told) && !isAhead(told),
  target: 'holding' as const,
  actions: act(noteStrangeMotion, beginHold),
};

/** While a hold or stop is being carried out: what still comes in completes the open row. */
export const comingToRest = {
  ...heard,
  'link.motion-began': [
    { guard: isAhead, actions: act(takeAhead) },
    { guard: isMine, actions: act(noteBegan) },
  ],
  'link.motion-ended': [{ guard: isMine, actions: act(noteEnded) }],
  'link.homed': [{ guard: isMine, actions: act(noteEnded) }],
  ...databaseNoted,
  'link.lost': { actions: act(noteLost) },
  'link.refused-controller': { actions: act(noteStranger) },
  'link.interlock': { actions: act(noteInterlock) },
  'link.supply': { actions: act(noteSupply) },
};

export function isOver({ context, event }: Told): boolean {
  const { step, ahead } = context.run;
  return step !== null && (ahead === null || ahead.cancelled) && event.at.utcMs >= standingEndUtcMs(step);
}

/** A hold after this step, of which the controller has not said that it cancelled the move that waited there: that may begin now. */
export const mayMoveAgainst = ({ context: { run } }: Told): boolean => run.holdAfterStep !== null && run.ahead !== null;

export function isOverdue({ context, event }: Told): boolean {
  const { ahead, deadlineUtcMs } = context.run;
  return ahead !== null && !ahead.cancelled && deadlineUtcMs !== null && event.at.utcMs >= deadlineUtcMs;
}

export function pick<T extends object, K extends keyof T>(from: T, ...keys: K[]): Pick<T, K> {
  return Object.fromEntries(keys.map((key) => [key, from[key]])) as Pick<T, K>;
}
