import { initialTransition, setup, transition } from 'xstate';
import type { RunStart } from '@/shared/archive/run-records';
import { explainStartRefusal, newContext, noteBeginning, startRefusal, startRun } from './beginning';
import { Draft, nothingOut, type Output } from './draft';
import {
  awaitReturn, becomeFailed, becomeFinished, becomeHeld, becomeStopped, beginHold, beginStop, carryOn, type GraveCause, noteGrave, noteInterruption,
  noteRefusedResume, noteRestart, requestHold, requestHoldAfterDwell, requestStop, resume, resumeRefusal, returnRefusal, takeAheadUnseen,
} from './halting';
import { hasRestarted, noteArmKey, noteEdge, noteInterlock, noteLease, noteLost, noteReady, noteRefusal, noteReset, noteStandstill, noteStranger, noteStrangeMotion, noteSupply } from './observations';
import { type Advance, CHART_VERSION, type ChartState, type RunContext, type RunEvent, type RunSnapshot } from './run-context';
import { askAgain, dropAhead, expectEnd, finishMotion, noteBegan, noteEnded, takeAhead } from './motions';
import { chooseNext, endStanding, sendAhead, standingEndUtcMs } from './steps';

/**
 * The run as a state chart: a pure function from a snapshot and an event to the next snapshot, the rows and events to be
 * saved and the effects to be performed after that. It holds no timers and no promises: `deadlineOf` says when the
 * driver is to send `deadline`.
 */

interface ChartContext {
  start: RunStart;
  run: RunContext;
  out: Output;
}

type Told = { context: ChartContext; event: RunEvent };
type Writer = (draft: Draft) => void;

const chart = setup({ types: { context: {} as ChartContext, events: {} as RunEvent, input: {} as { start: RunStart; nowUtcMs: number } } });

const draftOf = ({ context, event }: Told) => new Draft(context.start, event, { context: context.run, out: context.out });

/** An action: the writers one after another on one working copy. */
const act = (...writers: Writer[]) =>
  chart.assign((told) => {
    const draft = draftOf(told);
    for (const write of writers) write(draft);
    return { run: draft.context, out: draft.out };
  });

/** A guard that asks `holds` of the context as the writers would leave it. */
const when =
  (holds: (draft: Draft) => boolean, ...writers: Writer[]) =>
  (told: Told) => {
    const draft = draftOf(told);
    for (const write of writers) write(draft);
    return holds(draft);
  };

const policyIs = (policy: 'resume' | 'stop') => ({ context }: Told) => (context.start.protocol.onInterruption ?? 'hold') === policy;

/** Only a person may go on after this: held, or stopped where the protocol says so. */
const gravely = (...writers: Writer[]) => [
  { guard: policyIs('stop'), target: 'stopping' as const, actions: act(...writers, beginStop) },
  { target: 'holding' as const, actions: act(...writers, beginHold) },
];

/** What the protocol's `onInterruption` decides. */
const interruptedBy = (...writers: Writer[]) => [
  { guard: policyIs('stop'), target: 'stopping' as const, actions: act(...writers, noteInterruption, beginStop) },
  { guard: policyIs('resume'), target: 'interrupted' as const, actions: act(...writers, noteInterruption, awaitReturn) },
  { target: 'holding' as const, actions: act(...writers, noteInterruption, beginHold) },
];

const guarded = <T extends object>(guard: (told: Told) => boolean, transitions: T[]) =>
  transitions.map((entry) => ({ ...entry, guard: 'guard' in entry ? (told: Told) => guard(told) && (entry.guard as (told: Told) => boolean)(told) : guard }));

const fails = (code: string, text: string) => ({ target: 'failed' as const, actions: act((draft) => void draft.because(code, text)) });

const isMine = ({ context, event }: Told) => 'link' in event && 'commandId' in event.link && event.link.commandId === context.run.step?.motion?.commandId;
const isAhead = ({ context, event }: Told) => 'link' in event && 'commandId' in event.link && event.link.commandId === context.run.ahead?.commandId;
const isCancelled = ({ context }: Told) => context.run.ahead?.cancelled === true;
const bootedAnew = ({ context, event }: Told) => event.type === 'link.ready' && hasRestarted(context.run, event.link.controller.bootId);
const isOpenOrAbsent = ({ event }: Told) => (event.type === 'link.interlock' && !event.link.closed) || (event.type === 'link.supply' && !event.link.present);
const endedBy = (...causes: string[]) => (told: Told) => isMine(told) && told.event.type === 'link.motion-ended' && causes.includes(told.event.link.cause);
const refusedFor = (isFor: (told: Told) => boolean, ...codes: string[]) => (told: Told) => isFor(told) && told.event.type === 'link.refused' && codes.includes(told.event.link.code);
const graveOf = (cause: GraveCause) => (draft: Draft) => noteGrave(draft, cause);

/** Refusals that are over a moment later; all others say that the command is wrong or the controller is not fit. */
const passing = ['past', 'far', 'warning', 'lease', 'session', 'stopped', 'busy', 'old', 'repeat', 'reused', 'not-renewed', 'no-session', 'overtaken'];
const MOST_RETRIES = 3;

const explainRefusal: Writer = (draft) => {
  if (draft.event.type === 'link.refused') draft.because('command-refused', `The controller refused the motion: ${draft.event.link.message}`);
};
const explainHomeFailure: Writer = (draft) => {
  if (draft.event.type === 'link.home-failed') draft.because('home-failed', `Homing gave up: ${draft.event.link.message}`);
};
const explainController: Writer = (draft) => void draft.because('controller-refused', draft.told('link.refused-controller').link.why);
const explainStranger: Writer = (draft) => void draft.because('stopped-at-rig', 'The motion was ended at the rig, not by this run. Find out why, then resume.');
const explainNoReturn: Writer = (draft) => {
  const why = returnRefusal(draft);
  if (why !== null) draft.because(draft.context.interruption?.cause ?? 'held', `${draft.context.reason?.text ?? ''} ${why}`.trim());
};

/** A refused motion: the interlock or supply is an incident, a passing refusal is tried again, any other fails the run. */
const refusals = (isFor: (told: Told) => boolean, again: Writer) => [
  ...guarded(refusedFor(isFor, 'interlock'), gravely(noteRefusal, graveOf('interlock'))),
  ...guarded(refusedFor(isFor, 'supply'), gravely(noteRefusal, graveOf('supply'))),
  { guard: (told: Told) => refusedFor(isFor, ...passing)(told) && told.context.run.moveRetries < MOST_RETRIES, actions: act(noteRefusal, again) },
  { guard: isFor, target: 'failed' as const, actions: act(noteRefusal, explainRefusal) },
  { actions: act(noteRefusal) },
];

/** What the controller tells in every state, and what is only written down. */
const heard = {
  'link.arm-key': { actions: act(noteArmKey) },
  'link.edge': { actions: act(noteEdge) },
  'link.standstill': { actions: act(noteStandstill) },
  'link.lease-lapsed': { actions: act(noteLease) },
  'link.refused': { actions: act(noteRefusal) },
};

/** What ends or changes a run that is under way, whatever step it is in. */
const underWay = {
  ...heard,
  hold: { target: 'holding' as const, actions: act(requestHold) },
  stop: { target: 'stopping' as const, actions: act(requestStop) },
  'hold-after-dwell': { actions: act(requestHoldAfterDwell) },
  resume: { actions: act((draft) => draft.log('resume-refused', { why: 'the run is not held' })) },
  'link.lost': interruptedBy(noteLost),
  'link.ready': [...guarded(bootedAnew, gravely(noteReset, noteReady)), { actions: act(noteReady) }],
  'link.reset': gravely(noteReset),
  'link.interlock': [...guarded(isOpenOrAbsent, gravely(noteInterlock)), { actions: act(noteInterlock) }],
  'link.supply': [...guarded(isOpenOrAbsent, gravely(noteSupply)), { actions: act(noteSupply) }],
  'link.refused-controller': interruptedBy(noteStranger),
  'server-restarted': interruptedBy(),
  'database-away': interruptedBy(),
};

/** How the motion of the present step may end. */
const motionEnds = [
  { guard: endedBy('done'), target: 'choosing' as const, actions: act(noteEnded, finishMotion, chooseNext) },
  ...guarded(endedBy('lease'), interruptedBy(noteEnded)),
  ...guarded(endedBy('limit'), gravely(noteEnded, graveOf('limit'))),
  ...guarded(endedBy('interlock'), gravely(noteEnded, graveOf('interlock'))),
  ...guarded(endedBy('supply'), gravely(noteEnded, graveOf('supply'))),
  ...guarded(endedBy('reset'), gravely(noteEnded, graveOf('controller-reset'))),
  { guard: isMine, target: 'holding' as const, actions: act(noteEnded, explainStranger, beginHold) },
];

const strangeMotion = { guard: (told: Told) => !isMine(told) && !isAhead(told), target: 'holding' as const, actions: act(noteStrangeMotion, beginHold) };

/** While a hold or stop is being carried out: what still comes in completes the open row. */
const comingToRest = {
  ...heard,
  'link.motion-began': [{ guard: isAhead, actions: act(takeAhead) }, { guard: isMine, actions: act(noteBegan) }],
  'link.motion-ended': [{ guard: isMine, actions: act(noteEnded) }],
  'link.homed': [{ guard: isMine, actions: act(noteEnded) }],
  'link.lost': { actions: act(noteLost) },
  'link.refused-controller': { actions: act(noteStranger) },
  'link.interlock': { actions: act(noteInterlock) },
  'link.supply': { actions: act(noteSupply) },
};

const machine = chart.createMachine({
  id: 'run',
  context: ({ input }) => ({ start: input.start, run: newContext(input.start, input.nowUtcMs), out: nothingOut }),
  initial: 'starting',
  states: {
    starting: {
      on: {
        ...underWay,
        begin: [
          { guard: when((draft) => startRefusal(draft) !== null, noteBeginning), target: 'failed', actions: act(noteBeginning, explainStartRefusal) },
          { guard: ({ event }) => event.controller !== null, target: 'choosing', actions: act(noteBeginning, startRun) },
          { actions: act(noteBeginning) },
        ],
        'link.ready': [
          { guard: when((draft) => startRefusal(draft) !== null, noteReady), target: 'failed', actions: act(noteReady, explainStartRefusal) },
          { target: 'choosing', actions: act(noteReady, startRun) },
        ],
        'link.refused-controller': { target: 'failed', actions: act(explainController) },
        deadline: fails('no-answer', 'The controller never answered. Check that it is powered and that the right port is chosen.'),
      },
    },
    choosing: {
      always: [
        { guard: ({ context }) => context.run.next === 'homing', target: 'homing' },
        { guard: ({ context }) => context.run.next === 'moving', target: 'moving' },
        { guard: ({ context }) => context.run.next === 'standing', target: 'standing' },
        { guard: ({ context }) => context.run.next === 'finished', target: 'finished' },
        { guard: ({ context }) => context.run.next === 'holding', target: 'holding', actions: act(beginHold) },
        { target: 'failed' },
      ],
    },
    homing: {
      on: {
        ...underWay,
        'link.motion-began': [{ guard: isMine, actions: act(noteBegan, expectEnd) }, strangeMotion],
        'link.homed': { guard: isMine, target: 'choosing', actions: act(noteEnded, finishMotion, chooseNext) },
        'link.home-failed': { guard: isMine, target: 'failed', actions: act(explainHomeFailure) },
        /** `done` is followed by `homed`, which carries the angle. */
        'link.motion-ended': motionEnds.slice(1),
        'link.refused': refusals(isMine, askAgain),
        deadline: fails('no-answer', 'Homing took longer than the whole travel allows; the controller never said that it ended.'),
      },
    },
    moving: {
      on: {
        ...underWay,
        'link.motion-began': [{ guard: isMine, actions: act(noteBegan, expectEnd) }, strangeMotion],
        'link.motion-ended': motionEnds,
        'link.refused': refusals(isMine, askAgain),
        deadline: fails('no-answer', 'The move was sent, and the controller never said that it ended.'),
      },
    },
    standing: {
      on: {
        ...underWay,
        'link.motion-began': [
          { guard: (told) => isAhead(told) && !isCancelled(told), target: 'moving', actions: act(takeAhead, expectEnd) },
          { guard: isAhead, target: 'holding', actions: act(takeAhead, beginHold) },
          strangeMotion,
        ],
        'link.motion-ended': { guard: isAhead, actions: act(dropAhead) },
        'link.refused': refusals(isAhead, dropAhead),
        deadline: [
          { guard: isOverdue, ...fails('no-answer', 'The controller accepted the move and never began it.') },
          { guard: isOver, target: 'choosing', actions: act(endStanding, chooseNext) },
          { actions: act(sendAhead) },
        ],
      },
    },
    /** Under `resume`: waiting for the line, then for standstill. */
    interrupted: {
      on: {
        ...underWay,
        ...pick(comingToRest, 'link.motion-began', 'link.motion-ended', 'link.homed', 'link.refused-controller'),
        'link.ready': [...guarded(bootedAnew, gravely(noteReset, noteReady)), { actions: act(noteReady, awaitReturn) }],
        'link.standstill': [
          { guard: when((draft) => returnRefusal(draft) === null, noteStandstill, takeAheadUnseen), target: 'choosing', actions: act(noteStandstill, takeAheadUnseen, carryOn) },
          { target: 'holding', actions: act(noteStandstill, explainNoReturn, beginHold) },
        ],
        deadline: { target: 'holding', actions: act(explainNoReturn, beginHold) },
      },
    },
    holding: {
      on: {
        ...comingToRest,
        hold: { actions: act(requestHold) },
        stop: { target: 'stopping', actions: act(requestStop) },
        resume: { actions: act((draft) => draft.log('resume-refused', { why: 'the run is still coming to rest' })) },
        'link.standstill': { target: 'held', actions: act(noteStandstill) },
        'link.reset': { target: 'held', actions: act(noteReset) },
        'link.ready': [{ guard: bootedAnew, target: 'held', actions: act(noteReset, noteReady) }, { actions: act(noteReady, beginHold) }],
        'server-restarted': { actions: act(noteRestart) },
        deadline: { target: 'held' },
      },
    },
    held: {
      entry: act(becomeHeld),
      on: {
        ...heard,
        resume: [{ guard: when((draft) => resumeRefusal(draft) === null), target: 'choosing', actions: act(resume) }, { actions: act(noteRefusedResume) }],
        stop: { target: 'stopping', actions: act(requestStop) },
        'link.motion-began': { actions: act(noteStrangeMotion, (draft) => void draft.command((id) => ({ kind: 'hold', id }))) },
        ...pick(comingToRest, 'link.lost', 'link.refused-controller', 'link.interlock', 'link.supply'),
        'link.ready': [{ guard: bootedAnew, actions: act(noteReset, noteReady) }, { actions: act(noteReady) }],
        'link.reset': { actions: act(noteReset) },
        'server-restarted': { actions: act(noteRestart) },
      },
    },
    stopping: {
      on: {
        ...comingToRest,
        stop: { actions: act(requestStop) },
        'link.standstill': { target: 'stopped', actions: act(noteStandstill) },
        'link.reset': { target: 'stopped', actions: act(noteReset) },
        'link.ready': [{ guard: bootedAnew, target: 'stopped', actions: act(noteReset, noteReady) }, { actions: act(noteReady, beginStop) }],
        'server-restarted': { actions: act(noteRestart) },
        deadline: { target: 'stopped' },
      },
    },
    stopped: { entry: act(becomeStopped) },
    finished: { entry: act(becomeFinished) },
    failed: { entry: act(becomeFailed) },
  },
});

function isOver({ context, event }: Told): boolean {
  const { step, ahead } = context.run;
  return step !== null && (ahead === null || ahead.cancelled) && event.at.utcMs >= standingEndUtcMs(step);
}

function isOverdue({ context, event }: Told): boolean {
  const { ahead, deadlineUtcMs } = context.run;
  return ahead !== null && !ahead.cancelled && deadlineUtcMs !== null && event.at.utcMs >= deadlineUtcMs;
}

function pick<T extends object, K extends keyof T>(from: T, ...keys: K[]): Pick<T, K> {
  return Object.fromEntries(keys.map((key) => [key, from[key]])) as Pick<T, K>;
}

const snapshotOf = (state: unknown, context: RunContext): RunSnapshot => ({ version: CHART_VERSION, state: state as ChartState, context });

/** A run before anything has happened, at the server's time `nowUtcMs`. */
export function beginRun(start: RunStart, nowUtcMs: number): RunSnapshot {
  const [state] = initialTransition(machine, { start, nowUtcMs });
  return snapshotOf(state.value, state.context.run);
}

/** One event, pure: the same snapshot and event always give the same result. */
export function advance(start: RunStart, snapshot: RunSnapshot, event: RunEvent): Advance {
  if (event.type === 'deadline' && !isDue(snapshot, event.at.utcMs)) return { snapshot, steps: [], events: [], effects: [] };
  const from = machine.resolveState({ value: snapshot.state, context: { start, run: snapshot.context, out: nothingOut } });
  const [next] = transition(machine, from, event);
  const { steps, events, effects } = next.context.out;
  return { snapshot: snapshotOf(next.value, next.context.run), steps, events, effects };
}

/** UTC ms at which the driver is to send `deadline`; null: nothing is awaited by time. */
export const deadlineOf = (snapshot: RunSnapshot): number | null => snapshot.context.deadlineUtcMs;

/** A deadline that was overtaken by another event means nothing any more. */
const isDue = ({ context }: RunSnapshot, utcMs: number) => context.deadlineUtcMs !== null && utcMs >= context.deadlineUtcMs - 0.5;

const over: readonly ChartState[] = ['stopped', 'finished', 'failed'];
export const isRunOver = (snapshot: RunSnapshot): boolean => over.includes(snapshot.state);

/** States in which the controller may move the sources: only in these is the motion lease renewed. */
export const wantsMotion = ({ state, context }: RunSnapshot): boolean => state === 'homing' || state === 'moving' || (state === 'standing' && context.ahead !== null && !context.ahead.cancelled);
